"""What a plan says, and how near its forecasts of points and memory come."""

from __future__ import annotations

import math
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from matplotlib.figure import Figure

import bemwave
from bemwave import cli
from bemwave.case import Case, read_case
from bemwave.errors import InputError
from bemwave.geometry.files import write_mesh
from bemwave.geometry.forms import box
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import weld
from bemwave.handoff import box_of
from bemwave.handoff.box import box_points, box_volume
from bemwave.running import plan
from bemwave.running.budget import budget
from bemwave.running.check import coarser
from bemwave.running.sampling import sampled, sampling_memory
from bemwave.running.survey import survey

DEMONSTRATION = Path(cli.__file__).parents[1] / "examples" / "tender_on_panels.toml"
HUMP = {"height": 0.1, "width": 1.0}


def case(**tables: Any) -> Case:
    given = {
        "water": {"depth": 4.0},
        "surface": {"size": [10.0, 8.0], "spacing": 0.8},
        "hump": [HUMP],
        "run": {"duration": 10.0},
    }
    return Case(**{**given, **tables})


def told(asked: Case) -> dict[str, str]:
    rows = (line.split("  ", 1) for line in plan(asked).splitlines())
    return {label: text.strip() for label, text in rows}


def closed_box(name: str, size: Sequence[float], middle: Sequence[float]) -> SurfaceMesh:
    """One part, normals out of it."""
    length, beam, height = size
    lower = box(length, beam, 0.5 * height, 0.3)
    upper = lower.with_points(lower.points * [1.0, 1.0, -1.0]).flipped()
    both = weld(joined([lower, upper]), 1e-9)[0].flipped()
    return both.with_points(both.points + np.array(middle)).renamed(name)


def test_open_water() -> None:
    found = told(case())
    assert found["useful water"] == "10 x 8 m, 4 m deep"
    assert found["edges"] == "open"
    assert found["incident sea"] == "none"
    # the waves of a hump of width 1 are up to 6 m long
    assert "for waves up to 6 m" in found["absorber"]
    assert "not scattered" not in found


def test_closed_water() -> None:
    found = told(case(surface={"size": [10.0, 8.0], "spacing": 0.8, "edges": "wall"}))
    assert found["edges"] == "walls all round, meshed"
    assert "absorber" not in found


def test_a_straight_wall_is_an_image() -> None:
    walls = {"size": [10.0, 8.0], "spacing": 0.8, "edges": {"y_max": "wall"}}
    assert told(case(surface=walls))["edges"] == (
        "straight walls at y = 4, by images; open elsewhere"
    )


def test_sea_alone() -> None:
    found = told(case(hump=[], waves=[{"kind": "jonswap", "height": 0.2, "period": 2.0}]))
    assert found["panels"] == "none: the sea is all there is"
    assert found["incident sea"].startswith("1000 components, periods 0.5 to 4 s")
    # 1000 frequencies over 3.5 peak frequencies: some spacings are much smaller than the mean
    assert float(found["repeats after"].split()[0]) > 1000 * 2.0 / 3.5
    assert found["triangles"] == "0 (0 unknowns on the surface)"


def test_a_run_that_ends_too_early_is_told() -> None:
    assert "after the run's end, 1 s: a longer duration" in plan(case(run={"duration": 1.0}))
    assert "after the run's end" not in plan(case(run={"duration": 60.0}))


def test_a_gauge_in_a_waterline_is_told() -> None:
    tables = read_case(DEMONSTRATION).model_dump(exclude_unset=True, exclude_none=True)
    tables["gauge"][1]["position"] = [12.0, 1.0]
    found = told(Case(**tables).placed(DEMONSTRATION.parent))
    assert found["gauge between"] == "lies on or inside a waterline: it will read NaN"


def test_points_are_counted_as_they_are_made() -> None:
    asked = survey(read_case(DEMONSTRATION))
    handoff, frames = sampled(asked)
    box = box_of(asked.case.handoff[0])
    assert box is not None
    made = len(box_points(box).points) + len(box_volume(box).points)
    assert handoff.points == pytest.approx(made, rel=0.1)
    assert handoff.instants == 81
    assert (frames.points, frames.instants) == (47 * 37, 41)
    # four rows of eight bytes a point, over every node and panel
    least = 4 * 8 * made * (len(asked.water.points) + 1011)
    assert least < sampling_memory(asked) < 1.5 * least


def test_coarser_is_the_same_case_on_larger_panels_and_nothing_written() -> None:
    asked = read_case(DEMONSTRATION)
    found = coarser(asked, "panels")
    assert found.surface.spacing == pytest.approx(1.5 * 3.4)
    assert found.surface.fine_spacing == pytest.approx(1.5 * 1.4)
    assert found.surface.mesh is None
    assert [body.panel_size for body in found.body] == pytest.approx([1.8, 3.3])
    assert (found.handoff, found.gauge, found.frames) == ((), (), None)
    assert found.waves == asked.waves
    assert found.surface.absorber == asked.surface.absorber
    assert found.folder == asked.folder
    assert math.isinf(found.water.depth)


def test_a_hand_off_during_the_start_up_is_told() -> None:
    ball = {"name": "ball", "form": "sphere", "radius": 0.6, "centre_depth": 1.4}
    waves = [{"kind": "regular", "height": 0.1, "period": 2.0}]
    box = {"box": {"size": [4.0, 3.0], "bottom": -2.0, "top": 0.5}}
    found = plan(case(hump=[], waves=waves, body=[ball], handoff=[{**box, "start": 2.0}]))
    assert "hand-off handoff1 starts at 2 s, during the start-up" in found
    found = plan(case(hump=[], waves=waves, body=[ball], handoff=[{**box, "start": 4.0}]))
    assert "during the start-up" not in found


def test_the_picture_has_everything_to_scale_and_a_title_as_it_is(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    drawn: list[Figure] = []
    save = Figure.savefig
    monkeypatch.setattr(
        Figure, "savefig", lambda self, *a, **k: (drawn.append(self), save(self, *a, **k))[1]
    )
    asked = case(
        title="costs $5 and $x^{",
        waves=[{"kind": "regular", "height": 0.1, "period": 2.0, "heading": 30.0}],
        gauge=[{"name": "near", "position": [1.0, 2.0]}],
        handoff=[{"box": {"size": [4.0, 3.0], "bottom": -2.0, "top": 1.0, "angle": 20.0}}],
        frames={"region": {"size": [6.0, 6.0]}},
    )
    plan(asked, picture=tmp_path / "plan.png")
    assert (tmp_path / "plan.png").read_bytes().startswith(b"\x89PNG")
    (axes,) = drawn[0].axes
    assert axes.get_aspect() == 1.0
    assert axes.get_title() == asked.title
    assert (axes.get_xlabel(), axes.get_ylabel()) == ("x, m", "y, m")
    legend = axes.get_legend()
    assert legend is not None
    assert [text.get_text() for text in legend.get_texts()] == [
        "absorber",
        "useful water",
        "1: gauge near",
        "hand-off handoff1",
        "frames",
    ]
    assert "waves 1" in [text.get_text() for text in axes.texts]


@pytest.mark.parametrize("waves", [[], [{"kind": "regular", "height": 0.1, "period": 1.0}]])
def test_a_body_at_rest_without_waves_that_it_scatters(waves: list[dict[str, Any]]) -> None:
    body = {"name": "post", "form": "cylinder", "radius": 1.0, "draught": 1.0}
    found = told(case(body=[body], hump=[], waves=waves))
    assert found["resolution"].startswith("no waves are solved")


def test_the_width_of_parts_left_out_is_told_in_wavelengths(tmp_path: Path) -> None:
    parts = [
        closed_box("hull", (3.0, 2.0, 1.6), (0.0, 0.0, 0.0)),
        closed_box("rudder", (0.4, 0.06, 0.5), (-1.9, 0.0, -0.4)),
        closed_box("mast", (0.3, 0.2, 0.5), (0.0, 0.0, 2.0)),
    ]
    write_mesh(joined(parts), tmp_path / "boat.obj")
    body = {"name": "boat", "mesh": "boat.obj", "without": ["rudder", "mast"]}
    wave = {"kind": "regular", "height": 0.1, "period": 2.0}
    text = plan(case(body=[body], hump=[], waves=[wave]).placed(tmp_path))
    length = 2.0 * math.pi / bemwave.wavenumber(2.0, 4.0)
    told = f"{0.06 / length:.2g} of the shortest solved wave ({length:.3g} m)"
    assert f"left out: rudder, 0.06 m wide under water, {told}" in text
    assert "left out: mast, not under water" in text


def test_picture_of_a_grid(tmp_path: Path) -> None:
    grid = {"size": [10.0, 8.0], "spacing": 0.8, "route": "grid"}
    plan(case(surface=grid), picture=tmp_path / "plan.png")
    assert (tmp_path / "plan.png").read_bytes().startswith(b"\x89PNG")


def test_the_files_that_a_run_reads_are_listed(tmp_path: Path) -> None:
    rows = "frequency_rad_s,heading_deg,amplitude_m,phase_deg\n2.0,0,0.1,0\n"
    home = tmp_path / "case"
    home.mkdir()
    (home / "waves.csv").write_text(rows)
    (tmp_path / "swell.csv").write_text(rows)
    tables = [{"kind": "table", "file": name} for name in ("waves.csv", "../swell.csv")]
    asked = case(waves=tables).placed(home)
    lines = [line.split("  ", 1)[-1].strip() for line in plan(asked).splitlines()]
    first = lines.index(f"../swell.csv, which is {tmp_path / 'swell.csv'}")
    assert lines[first + 1] == "waves.csv"


@pytest.mark.parametrize(
    ("tables", "where"),
    [
        ({"run": {"duration": 10.0, "record_every": 1e-7}}, r"\[run\] record_every = 1e-07 s"),
        (
            {"wavemaker": [{"side": "x_min", "kind": "flap", "stroke": 0.1, "period": 1e-6}]},
            "the shortest waves, of 1e-06 s,",
        ),
        ({"frames": {"fps": 1e7}}, r"\[frames\] fps = 1e\+07"),
        (
            {"handoff": [{"box": {"size": [2, 2], "bottom": -1, "top": 1}, "every": 1e-7}]},
            r'\[\[handoff\]\] "handoff1" every = 1e-07 s',
        ),
    ],
)
def test_more_instants_than_a_file_should_hold_are_refused(tables: Any, where: str) -> None:
    walls = {"surface": {"size": [10.0, 8.0], "spacing": 0.8, "edges": "wall"}}
    with pytest.raises(InputError, match=where + r" in 10 s makes \S+ instants; expected at most"):
        plan(case(**walls, **tables))


def test_a_shorter_step_takes_its_time() -> None:
    one, ten, hundred = (
        budget(survey(case(run={"duration": 10.0, "step": step}))).stepping
        for step in (1e-2, 1e-3, 1e-4)
    )
    assert hundred - ten == pytest.approx(10.0 * (ten - one))
