"""kill -9 at random instants: the run goes on, and ends with the very data of one never stopped."""

from __future__ import annotations

import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from tests.restart.cases import CASES, assert_readable, assert_same, command, wait_for, write_case

# a checkpoint after every instant or so, that kills fall among writes of every kind
OFTEN = "checkpoint_every = 0.02\n"


def finish(case: Path, *more: str) -> float:
    """Run a case to its end; the seconds it took after it was set up."""
    running = command("run", case.name, *more, cwd=case.parent)
    started = wait_for(case.with_name("case-run") / "log.txt", "set up in", running)
    _, complaint = running.communicate(timeout=120)
    assert running.returncode == 0, complaint
    return time.monotonic() - started


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], tuple[Path, float]]:
    """The folder of each case's uninterrupted run, and the seconds from its setting up to its end.

    Made in a process of its own too: threads and libraries are those of the runs that are killed.
    """
    made: dict[str, tuple[Path, float]] = {}

    def of(name: str) -> tuple[Path, float]:
        if name not in made:
            home = tmp_path_factory.mktemp("whole")
            seconds = finish(often(name, home))
            made[name] = home / "case-run", seconds
        return made[name]

    return of


def often(name: str, home: Path) -> Path:
    case = write_case(name, home)
    case.write_text(case.read_text().replace("[run]\n", f"[run]\n{OFTEN}"))
    return case


def kill_and_resume(
    name: str, kills: int, home: Path, whole: Callable[[str], tuple[Path, float]], seed: int
) -> int:
    """Kill one run again and again and let it finish; how many of the kills found it running."""
    expected, seconds = whole(name)
    case = often(name, home)
    folder, rng, found = home / "case-run", np.random.default_rng(seed), 0
    for _ in range(kills):
        running = command("run", case.name, "--resume", cwd=home)
        wait_for(folder / "log.txt", "set up in", running)
        time.sleep(max(0.0, rng.uniform(-0.1, 0.7) * seconds))
        if running.poll() is None:
            found += 1
            running.kill()
        running.communicate()
        assert_readable(folder)
    finish(case, "--resume")
    assert_same(expected, folder)
    return found


SHORT = ("tank", "moved by file")


@pytest.mark.parametrize(
    "name", [pytest.param(name, marks=[] if name in SHORT else pytest.mark.slow) for name in CASES]
)
def test_a_killed_run_ends_with_the_same_data(
    name: str, tmp_path: Path, whole: Callable[[str], tuple[Path, float]]
) -> None:
    assert kill_and_resume(name, 1, tmp_path, whole, seed=11) == 1


@pytest.mark.long
def test_a_hundred_kills_and_all_ends_are_the_same(
    tmp_path: Path, whole: Callable[[str], tuple[Path, float]]
) -> None:
    rng, kills, trial = np.random.default_rng(4), 0, 0
    while kills < 100:
        name = list(CASES)[trial % len(CASES)]
        home = tmp_path / str(trial)
        home.mkdir()
        kills += kill_and_resume(name, int(rng.integers(1, 4)), home, whole, seed=trial)
        trial += 1
