"""The demonstration, and its like on panels: meshes and cases agree, runs pass all checks."""

from __future__ import annotations

import json
import runpy
from pathlib import Path

import netCDF4
import numpy as np
import pytest

from bemwave import cli
from bemwave.case import read_case
from bemwave.geometry.files import read_mesh
from bemwave.running.forecast import trustworthy_from
from bemwave.running.sea import length_of_period
from bemwave.running.survey import survey

ROOT = Path(cli.__file__).parents[1]
CASE = ROOT / "examples" / "tender_by_platform.toml"
ON_PANELS = ROOT / "examples" / "tender_on_panels.toml"


def test_the_case_is_the_one_that_the_meshes_were_made_for() -> None:
    made = runpy.run_path(str(ROOT / "meshes" / "make_demo_meshes.py"))
    case, large = read_case(ON_PANELS), read_case(CASE)
    surface, (tender, platform) = case.surface, case.body
    assert (surface.size, surface.absorber) == (made["SIZE"], made["ABSORBER"])
    assert (surface.spacing, surface.fine_spacing) == (made["SPACING"], made["FINE_SPACING"])
    assert (tender.position, tender.heading) == (made["TENDER_POSITION"], made["TENDER_HEADING"])
    assert platform.position == made["PLATFORM_POSITION"]
    assert platform.heading == made["PLATFORM_HEADING"]
    assert (tender.panel_size, platform.panel_size) == (
        made["TENDER_PANEL"],
        made["PLATFORM_PANEL"],
    )
    assert [body.panel_size for body in large.body] == [
        made["TENDER_PANEL"],
        made["OFFSHORE_PANEL"],
    ]


@pytest.mark.slow
@pytest.mark.usefixtures("needs_gmsh")
def test_the_meshes_are_those_that_the_script_makes(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "tender.stl").write_bytes((ROOT / "meshes" / "tender.stl").read_bytes())
    made = runpy.run_path(str(ROOT / "meshes" / "make_demo_meshes.py"))
    monkeypatch.setitem(made["main"].__globals__, "FOLDER", tmp_path)
    made["main"]()
    for name in ("tender-wetted.vtu", "offshore-platform.vtu", "platform.vtu", "water.vtu"):
        old, new = read_mesh(ROOT / "meshes" / name), read_mesh(tmp_path / name)
        # another version of the mesher may place points a little differently
        assert len(new.triangles) == pytest.approx(len(old.triangles), rel=0.05)
        assert new.areas.sum() == pytest.approx(old.areas.sum(), rel=0.01)


@pytest.mark.parametrize("path", [CASE, ON_PANELS])
def test_the_plan_is_sound_and_needs_no_mesher(path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def no_mesher(*arguments: object, **keys: object) -> None:
        raise AssertionError("gmsh was asked for")

    monkeypatch.setattr("bemwave.geometry.mesher.subprocess.run", no_mesher)
    case = read_case(path)
    found = survey(case)
    assert found.mesh is not None
    assert len(found.mesh.triangles) <= 6000
    assert found.route[0] == ("grid" if path == CASE else "panels")
    peak = length_of_period(case.waves[0].period or 0.0, case.water.depth, case.water.gravity)
    assert peak / case.surface.spacing > 10.0
    assert found.unscattered_share < 0.01
    assert found.layer is not None
    assert found.layer.reflection < 0.02
    assert trustworthy_from(found) < case.handoff[0].start


def test_the_demonstration_is_a_square_kilometre() -> None:
    surface = read_case(CASE).surface
    assert min(surface.extent) >= 1000.0
    assert 1.5 <= surface.spacing <= 2.0


@pytest.mark.slow
@pytest.mark.parametrize("path", [CASE, ON_PANELS])
def test_the_run_passes_all_its_checks(path: Path, tmp_path: Path) -> None:
    out = tmp_path / "run"
    assert cli.status_of(["run", str(path), "--out", str(out)]) == 0
    checks = json.loads((out / "checks.json").read_text())
    verdicts = {c["name"]: c["verdict"] for c in checks}
    passed = ("energy", "volume_flux", "divergence", "matrix_symmetry", "reflection")
    assert [verdicts[name] for name in passed] == ["pass"] * 5
    frames = {file.name for file in (out / "frames").iterdir()}
    assert {"surface.pvd", "surface_00001.ply", "surface_00026.vtp", "body_tender.ply"} <= frames
    with netCDF4.Dataset(out / "gauges.nc") as gauges:
        assert list(gauges["name"][:]) == ["under_deck", "between", "lee"]
        elevation, incident = (
            np.asarray(gauges[name][:]) for name in ("elevation", "incident_elevation")
        )
        gap = np.asarray(gauges["gap"][:])
    assert gap[:, 0] == pytest.approx((read_case(path).gauge[0].deck or 0.0) - elevation[:, 0])
    late = slice(len(elevation) // 2, None)
    # behind the tender there is less sea than would be without her, before her more
    assert elevation[late, 2].std() < incident[late, 2].std()
    assert elevation[late, 1].std() > incident[late, 1].std()
    with netCDF4.Dataset(out / "handoff" / "box-start.nc") as start:
        wet = np.asarray(start["wet"][0])
        assert np.isfinite(np.asarray(start["u"][0].filled(np.nan))[wet > 0]).all()
        assert (wet == 0).any()  # the tender is in the box
