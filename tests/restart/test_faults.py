"""A field that grows without a source, or memory that ends: the run stops at once with code 3."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from bemwave import cli, open_run
from bemwave.errors import RunError
from bemwave.flow import panels
from bemwave.running import loop
from bemwave.running.faults import GrowthGuard
from tests.restart.cases import assert_readable

BASIN = """\
[water]
depth = 1.0
[surface]
size = [4.0, 1.5]
spacing = 0.4
edges = "wall"
[[hump]]
height = 0.02
width = 0.5
[run]
duration = 20.0
record_every = 0.1
"""


def stopped(home: Path, capsys: pytest.CaptureFixture[str]) -> str:
    (home / "case.toml").write_text(BASIN)
    assert cli.status_of(["run", str(home / "case.toml"), "--out", str(home / "run")]) == 3
    told = capsys.readouterr().err
    assert told.count("\n") == 1
    return told


def test_an_unstable_scheme_is_stopped_with_its_step(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    sound = panels.exact_map
    # a map of the step that is far too strong for leapfrog: what it makes grows from step to step
    monkeypatch.setattr(panels, "exact_map", lambda *arguments: 100.0 * sound(*arguments))
    told = stopped(tmp_path, capsys)
    assert "the energy of the solved waves grew to " in told
    assert "J at step " in told
    assert "were there or put in; expected no more than that: what was written before" in told
    run = open_run(tmp_path / "run")
    assert run.manifest.status == "failed"
    assert_readable(tmp_path / "run")
    assert len(run.times) >= 1


def test_no_memory_left_is_told_with_the_step(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def starved(*arguments: Any) -> None:
        raise MemoryError

    monkeypatch.setattr(loop, "refuse_no_numbers", starved)
    assert "the machine has no memory left at step " in stopped(tmp_path, capsys)


class _AtStep:
    class stepper:
        count, time = 7, 0.7


def test_energy_may_be_what_was_put_in_and_no_more() -> None:
    guard, power, energy = GrowthGuard(_AtStep()), 0.0, 0.0  # type: ignore[arg-type]
    for time in np.arange(1, 50) * 0.1:  # all of a growing power is kept
        energy, power = energy + 0.1 * (power + time**2) / 2, time**2
        guard.check(time, energy, power)
    with pytest.raises(RunError, match=r"grew to \S+ J at step 7, t = 0.7 s, and only"):
        guard.check(5.0, 6.0 * energy, power)
    with pytest.raises(RunError, match="grew to nan J"):
        guard.check(5.1, np.nan, power)
