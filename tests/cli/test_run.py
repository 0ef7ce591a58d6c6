"""A run at the command line from case to verdicts: what is printed, and the exit codes."""

from __future__ import annotations

import json
from importlib import import_module
from pathlib import Path

import pytest

from bemwave.cli import status_of
from bemwave.handoff.writer import CAUTION
from bemwave.records import write_checks
from bemwave.records.checks_file import Verdict

TANK = """\
title = "A hump let go in a tank"
[water]
depth = 1.0
[surface]
size = [3.0, 2.0]
spacing = 0.3
edges = "wall"
[[hump]]
height = 0.02
width = 0.6
[run]
duration = 1.0
[[gauge]]
name = "middle"
position = [0.1, 0.1]
"""


@pytest.fixture
def tank(tmp_path: Path) -> Path:
    file = tmp_path / "tank.toml"
    file.write_text(TANK)
    return file


def test_a_run_tells_folder_verdicts_and_last_the_caution(
    tank: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert status_of(["run", str(tank)]) == 0
    told = capsys.readouterr()
    lines = told.out.splitlines()
    assert told.err == ""
    folder = tank.with_name("tank-run")
    assert f"run folder: {folder}" in lines
    assert lines[-1] == CAUTION
    checks = json.loads((folder / "checks.json").read_text())
    assert [check["name"] for check in checks] == ["energy", "matrix_symmetry", "dispersion"]
    for check in checks:
        assert any(line.startswith(check["name"]) and check["verdict"] in line for line in lines)
    for name in ("case.toml", "mesh.vtp", "sea.nc", "history.nc", "gauges.nc", "log.txt"):
        assert (folder / name).is_file()


def test_a_second_run_is_refused_and_a_resumed_one_has_nothing_to_do(
    tank: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert status_of(["run", str(tank)]) == 0
    assert status_of(["run", str(tank)]) == 2
    told = capsys.readouterr()
    assert told.err.startswith(f"error: {tank.with_name('tank-run')} already holds a run")
    assert status_of(["run", str(tank), "--resume"]) == 0
    told = capsys.readouterr()
    assert "holds a finished run: nothing is left to do" in told.out
    assert told.out.splitlines()[-1] == CAUTION


def test_check_judges_again_and_fails_with_1(
    tank: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    out = tmp_path / "out"
    assert status_of(["run", str(tank), "--out", str(out)]) == 0
    before = (out / "checks.json").read_bytes()
    write_checks([], out / "checks.json")
    assert status_of(["check", str(out)]) == 0
    assert (out / "checks.json").read_bytes() == before
    assert "energy" in capsys.readouterr().out

    # the package's name `check` is the function
    module = import_module("bemwave.running.check")
    bad = Verdict("energy", 0.5, 0.02, "fail", "conservation of energy")
    monkeypatch.setattr(module, "judge", lambda run: [bad])
    assert status_of(["check", str(out)]) == 1
    assert capsys.readouterr().out.splitlines()[1].split() == [
        "energy", "0.5", "0.02", "fail", "conservation", "of", "energy",
    ]  # fmt: skip


def test_check_of_no_run_is_an_error(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert status_of(["check", str(tmp_path)]) == 2
    assert capsys.readouterr().err.startswith(f"error: {tmp_path} holds no run")


def test_convergence_compares_with_coarser_panels(
    tank: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert status_of(["run", str(tank)]) == 0
    folder = tank.with_name("tank-run")
    status_of(["check", str(folder), "--convergence"])
    (found,) = (
        check
        for check in json.loads((folder / "checks.json").read_text())
        if check["name"] == "convergence"
    )
    assert 0.0 < found["figure"] < 0.2
    assert found["limit"] == 0.1


def test_plan_says_what_a_run_takes_and_draws_it(
    tank: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    picture = tmp_path / "plan.png"
    assert status_of(["plan", str(tank), "--picture", str(picture)]) == 0
    told = capsys.readouterr().out
    for label in ("route", "useful water", "resolution", "phase error", "trust from", "memory"):
        assert f"\n{label} " in f"\n{told}"
    assert picture.read_bytes().startswith(b"\x89PNG")
    assert not tank.with_name("tank-run").exists()
