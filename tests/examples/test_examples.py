"""Every example runs, is short, and gives the number that theory or an earlier run gives."""

from __future__ import annotations

import runpy
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

EXAMPLES = Path(__file__).parents[2] / "examples"
SCRIPTS = sorted(EXAMPLES.glob("*.py"))


def main_of(name: str) -> Callable[..., Any]:
    main: Callable[..., Any] = runpy.run_path(str(EXAMPLES / name))["main"]
    return main


@pytest.fixture(scope="module")
def buoy(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, tuple[float, float]]:
    """The run of hand_off.py, and what it returned."""
    folder = tmp_path_factory.mktemp("buoy") / "run"
    return folder, main_of("hand_off.py")(str(folder))


@pytest.mark.parametrize("script", SCRIPTS, ids=lambda path: path.name)
def test_an_example_is_short(script: Path) -> None:
    assert len(script.read_text(encoding="utf-8").splitlines()) <= 60


def test_every_example_is_run_here() -> None:
    here = Path(__file__).read_text(encoding="utf-8")
    assert len(SCRIPTS) >= 3
    assert all(f'"{script.name}"' in here for script in SCRIPTS)


def test_hand_off(buoy: tuple[Path, tuple[float, float]]) -> None:
    imbalance, gained = buoy[1]
    # first-order closure: 1 % of the largest face flux is the limit of the checks
    assert imbalance < 0.01
    assert imbalance == pytest.approx(0.0024, abs=0.001)
    # a field that follows u with du/dt = (3.5/T)(u_far - u) has 1/sqrt(1 + (2 pi/3.5)^2) = .49 of
    # a swing of period T; at one instant of it, at the sides, more or less
    assert gained == pytest.approx(0.54, abs=0.03)


def test_live_coupling() -> None:
    found, theory = main_of("live_coupling.py")()
    # Stokes (1847) to second order; waves of a k = .02
    assert found == pytest.approx(theory, rel=0.01)
    assert theory == pytest.approx(np.array([1.4973e-3, 0.9573e-3, 0.3913e-3]), rel=1e-3)


def test_wave_tank(tmp_path: Path) -> None:
    measured, theory = main_of("wave_tank.py")(str(tmp_path / "run"))
    # Dean & Dalrymple (1991), eq. 6.23, at k h = 1.7
    assert theory == pytest.approx(1.5518, rel=1e-3)
    assert measured == pytest.approx(theory, rel=0.01)


def test_hull_file(tmp_path: Path) -> None:
    displacement = main_of("hull_file.py")(tmp_path / "wetted.vtp")
    # meshes/make_tender.py: 190 t in sea water at her draught of 1.9 m
    assert displacement[1.9] == pytest.approx(190.0, abs=0.1)
    assert (tmp_path / "wetted.vtp").stat().st_size > 10_000


def test_surface_picture(buoy: tuple[Path, tuple[float, float]], tmp_path: Path) -> None:
    highest = main_of("surface_picture.py")(str(buoy[0]), str(tmp_path / "picture.png"))
    assert (tmp_path / "picture.png").read_bytes().startswith(b"\x89PNG")
    assert highest == pytest.approx(0.0040, abs=0.0004)
