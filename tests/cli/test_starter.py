"""The case that `bemwave new` writes: its plan, and the run of it, as a newcomer types them."""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np
import pytest

from bemwave.cli import status_of
from bemwave.records import read_checks


@pytest.fixture
def case(tmp_path: Path) -> Path:
    assert status_of(["new", str(tmp_path / "first")]) == 0
    return tmp_path / "first" / "case.toml"


@pytest.mark.usefixtures("needs_gmsh")
def test_its_plan(case: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert status_of(["plan", str(case)]) == 0
    told = dict(line.split("  ", 1) for line in capsys.readouterr().out.splitlines())
    told = {label: text.strip() for label, text in told.items()}
    assert told["body barge"].endswith("8 x 4 x 1 m, 32 m3, waterplane 32 m2")
    assert told["resolution"].startswith("12.7 panels in the shortest solved wave (19.1 m, 3.5 s)")
    assert "after the run's end" not in told["trust from"]
    assert float(told["memory"].split()[0]) < 2.0


@pytest.mark.usefixtures("needs_gmsh")
def test_its_run(case: Path) -> None:
    assert status_of(["run", str(case)]) == 0
    folder = case.with_name("case-run")
    verdicts = {verdict.name: verdict.verdict for verdict in read_checks(folder / "checks.json")}
    assert {"energy", "volume_flux", "divergence", "reflection"} <= verdicts.keys()
    assert "fail" not in verdicts.values()
    assert (folder / "frames" / "surface.pvd").is_file()
    with netCDF4.Dataset(folder / "gauges.nc") as gauges:
        late = gauges["time"][:] > 14.0
        incident = np.asarray(gauges["incident_elevation"][late, 0])
        ahead = np.asarray(gauges["elevation"][late, 0])
    assert np.ptp(incident) == pytest.approx(0.3, rel=0.02)
    # the barge throws some of the waves back, and less than a wall would
    assert 0.1 < np.ptp(ahead - incident) / np.ptp(incident) < 1.0
    with netCDF4.Dataset(folder / "bodies.nc") as bodies:
        late = bodies["time"][:] > 14.0
        heave = np.asarray(bodies["force"][late, 0, 2])
    # below what still water would bear of a waterplane lifted by the whole wave
    stiffness = 1025.0 * 9.80665 * 32.0
    assert 0.2 < np.ptp(heave) / (stiffness * 0.3) < 1.0
