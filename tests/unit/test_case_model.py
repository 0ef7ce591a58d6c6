"""The model of a case: defaults, what is filled in, and cases made in Python."""

from __future__ import annotations

import inspect
import math
from pathlib import Path
from typing import Any

import pytest

from bemwave.case import Case, read_case
from bemwave.case.sea import Wave
from bemwave.errors import InputError
from bemwave.waves import make_sea


def tables(**changes: Any) -> dict[str, Any]:
    least = {
        "water": {"depth": 10.0},
        "surface": {"size": [40.0, 30.0], "spacing": 2.0},
        "run": {"duration": 20.0},
    }
    return least | changes


def test_the_defaults_of_the_least_case() -> None:
    case = Case(**tables())
    assert (case.water.density, case.water.gravity) == (1025.0, 9.80665)
    assert (case.surface.route, case.surface.edges, case.surface.absorber) == (
        "auto", "absorb", "auto",
    )  # fmt: skip
    assert case.surface.fine_spacing is None
    assert case.run.record_every == 20.0 / 200
    assert case.run.checkpoint_every == 60.0
    assert case.waves == case.body == case.hump == case.handoff == ()
    assert case.frames is None


def test_the_defaults_of_waves_and_bodies() -> None:
    wave = {"kind": "jonswap", "height": 1.0, "period": 6.0}
    body = {"name": "hull", "mesh": "hull.stl"}
    case = Case(**tables(waves=[wave], body=[body]))
    sea, hull = case.waves[0], case.body[0]
    assert (sea.heading, sea.seed, sea.components, sea.peakedness) == (0.0, 1, 1000, 3.3)
    assert sea.spreading is None
    assert (hull.path, hull.attitude, hull.draught) == ("fixed", "fixed", None)
    assert (hull.scale, hull.up, hull.position) == (1.0, "z", (0.0, 0.0))


def test_hand_offs_take_name_end_and_spacing_from_the_case() -> None:
    box = {"size": [10.0, 10.0], "bottom": -5.0, "top": 1.0}
    given = {"name": "mine", "box": box, "end": 10.0, "spacing": 0.5}
    case = Case(**tables(handoff=[{"box": box}, given]))
    first, second = case.handoff
    assert (first.name, first.end, first.spacing) == ("handoff1", 20.0, (1.0, 1.0))
    assert (second.name, second.end, second.spacing) == ("mine", 10.0, (0.5, 0.5))
    assert (first.start, first.zone, first.every, first.crest) == (0.0, 0.0, "auto", "linear")
    assert (first.layout, first.axes, first.velocity, first.field) == (
        "points", "earth", "earth", "total",
    )  # fmt: skip


def test_frames_take_end_and_spacing_from_the_case() -> None:
    frames = Case(**tables(frames={})).frames
    assert frames is not None
    assert (frames.fps, frames.start, frames.end, frames.spacing) == (24.0, 0.0, 20.0, 2.0)


def test_gauges_without_a_name_are_numbered() -> None:
    gauges = [{"position": [0, 0]}, {"position": [1, 0], "name": "bow"}, {"position": [2, 0]}]
    case = Case(**tables(gauge=gauges))
    assert [gauge.name for gauge in case.gauge] == ["gauge1", "bow", "gauge3"]


@pytest.mark.parametrize("depth", ["deep", math.inf])
def test_deep_water_is_infinite(depth: object) -> None:
    assert Case(**tables(water={"depth": depth})).water.depth == math.inf


def test_sides_and_walls() -> None:
    surface = {"size": [40.0, 30.0], "spacing": 2.0, "edges": {"x_min": "wall", "y_max": "wall"}}
    case = Case(**tables(surface=surface))
    assert case.surface.walls == ("x_min", "y_max")
    assert case.surface.edge("x_max") == "absorb"


def test_a_circle_is_given_by_its_diameter() -> None:
    surface = {"size": 30, "spacing": 2.0, "outline": "circle", "centre": [5.0, 0.0]}
    water = Case(**tables(surface=surface)).surface
    assert water.extent == (30.0, 30.0)
    assert water.contains(20.0, 0.0)
    assert not water.contains(19.0, 9.0)


def test_a_table_of_waves_needs_no_height_nor_period() -> None:
    case = Case(**tables(waves=[{"kind": "table", "file": "sea.csv"}]))
    assert case.waves[0].height is None


def test_a_basin_with_walls_round_it_may_have_a_wavemaker() -> None:
    surface = {"size": [40.0, 30.0], "spacing": 2.0, "edges": "wall"}
    maker = {"side": "x_min", "kind": "flap", "stroke": 0.1, "period": 3.0}
    assert Case(**tables(surface=surface, wavemaker=[maker])).wavemaker[0].kind == "flap"


def test_one_hand_off_may_not_take_the_file_of_anothers_start() -> None:
    box = {"size": [10.0, 10.0], "bottom": -5.0, "top": 1.0}
    near = {"name": "near", "box": box, "volume_at_start": True}
    with pytest.raises(InputError, match=r'\[\[handoff\]\] "near-start" name: got "near-start"'):
        Case(**tables(handoff=[near, {"name": "near-start", "box": box}]))


def test_a_case_made_in_python_is_checked_alike() -> None:
    with pytest.raises(InputError) as caught:
        Case(**tables(water={"depth": 0.0}, humps=[]))
    assert str(caught.value) == (
        'case: [water] depth: got 0.0, expected a number above 0 in metres, or "deep"\n'
        "case: [[humps]]: unknown table, did you mean [[hump]]?"
    )


def test_values_do_not_change() -> None:
    case = Case(**tables())
    with pytest.raises(ValueError, match="frozen"):
        case.water.depth = 5.0  # type: ignore[misc]


def test_a_case_that_was_read_knows_its_folder_and_text(tmp_path: Path) -> None:
    text = '# mine\n[water]\ndepth = "deep"\n[surface]\nsize = [9, 9]\nspacing = 1\n'
    text += "[run]\nduration = 2\n"
    (tmp_path / "case.toml").write_text(text)
    case = read_case(tmp_path / "case.toml")
    assert (case.folder, case.text) == (tmp_path, text)
    assert Case(**tables()).folder == Path()


@pytest.mark.parametrize("name", ["water", "bed", "wall_x_min"])
def test_a_body_may_not_be_called_as_the_water_and_its_walls(name: str) -> None:
    with pytest.raises(InputError, match="a name kept for the water"):
        Case(**tables(body=[{"name": name, "form": "sphere", "radius": 1.0}]))


def test_the_keys_of_a_wave_are_those_a_sea_is_made_from() -> None:
    assert set(Wave.model_fields) <= set(inspect.signature(make_sea).parameters)
