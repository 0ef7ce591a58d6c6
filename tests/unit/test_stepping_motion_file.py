"""Motions read from a file: smooth between its rows, eased in, and of known periods."""

from pathlib import Path

import numpy as np
import pytest

from bemwave.case import Case
from bemwave.errors import InputError
from bemwave.flow.elements import split
from bemwave.running.driving import driving
from bemwave.running.survey import survey
from bemwave.stepping.forcing import Oscillation, Ramp
from bemwave.stepping.motion_file import HEADER, FileMotion, MotionFile

PERIOD = 6.0
W = 2.0 * np.pi / PERIOD
H = 1e-4


def write(path: Path, t, **motions) -> Path:
    columns = [t] + [motions.get(name, np.zeros(len(t))) for name in HEADER[1:]]
    np.savetxt(path, np.column_stack(columns), delimiter=",", header=",".join(HEADER), comments="")
    return path


@pytest.fixture
def rolling(tmp_path):
    """Heave of .3 m and roll of 8 degrees, ten rows a period."""
    t = np.arange(0.0, 36.1, 0.1 * PERIOD)
    return write(tmp_path / "m.csv", t, heave=0.3 * np.sin(W * t), roll=8.0 * np.cos(W * t))


def test_between_rows_the_motions_are_the_smooth_ones_they_were_taken_from(rolling):
    file = MotionFile(rolling, 30.0)
    t = np.linspace(3.0, 30.0, 500)
    roll = np.radians(8.0)
    heave = [0.3 * np.sin(W * t), 0.3 * W * np.cos(W * t), -0.3 * W**2 * np.sin(W * t)]
    rolls = [roll * np.cos(W * t), -roll * W * np.sin(W * t), -roll * W**2 * np.cos(W * t)]
    for order, within in enumerate((1e-4, 3e-4, 3e-3)):  # of the largest value
        got = file.derivative(t, order)
        assert got[:, 2] == pytest.approx(heave[order], abs=within * 0.3 * W**order)
        assert got[:, 3] == pytest.approx(rolls[order], abs=within * roll * W**order)
        assert not got[:, [0, 1, 4, 5]].any()
    assert file.moved == (2, 3)


def test_a_file_s_motion_is_eased_in_like_a_forced_one(rolling):
    ramp = Ramp(8.0)
    file = MotionFile(rolling, 30.0)
    heave, forced = FileMotion(file, 2, ramp), Oscillation(0.3, W, ramp)
    t = np.linspace(0.0, 30.0, 301)
    for what, within in (("displacement", 1e-4), ("velocity", 1e-3), ("acceleration", 2e-2)):
        got, want = getattr(heave, what)(t), getattr(forced, what)(t)
        np.testing.assert_allclose(got, want, atol=within * np.abs(want).max())
    roll = FileMotion(file, 3, ramp)
    assert roll.displacement(np.zeros(1))[0] == 0.0  # though the file begins at 8 degrees
    at = np.array([0.3, 2.2, 7.9, 8.4, 20.1])
    for value, rate in ((roll.displacement, roll.velocity), (roll.velocity, roll.acceleration)):
        slope = (value(at + H) - value(at - H)) / (2 * H)
        np.testing.assert_allclose(rate(at), slope, atol=1e-6)


def test_the_periods_are_those_of_the_motion(tmp_path):
    t = np.arange(0.0, 240.1, 0.25)
    both = write(
        tmp_path / "m.csv", t, heave=np.sin(2 * np.pi * t / 8), pitch=5 * np.sin(2 * np.pi * t / 4)
    )
    longest, shortest = MotionFile(both, 240.0).periods(arm=20.0)
    assert longest == pytest.approx(8.0, rel=0.04)
    assert shortest == pytest.approx(4.0, rel=0.04)
    # without an arm the pitch moves no water at all
    longest, shortest = MotionFile(both, 240.0).periods(arm=0.0)
    assert (longest, shortest) == pytest.approx((8.0, 8.0), rel=0.04)
    still = write(tmp_path / "still.csv", t, surge=np.ones(len(t)))
    assert MotionFile(still, 240.0).periods(arm=1.0) is None


def test_the_periods_of_a_long_run_are_those_of_its_motion(tmp_path):
    """Six hours: far more periods than a fixed number of samples would show."""
    t = np.arange(0.0, 21600.1, 0.1 * PERIOD)
    long = write(tmp_path / "m.csv", t, heave=0.3 * np.sin(W * t))
    assert MotionFile(long, 21600.0).periods(arm=1.0) == pytest.approx((PERIOD, PERIOD), rel=0.01)



def test_a_case_with_a_file_is_driven_and_stepped_by_it(tmp_path):
    t = np.arange(0.0, 20.1, 0.25)
    write(tmp_path / "m.csv", t, heave=0.1 * np.sin(np.pi * t))
    case = Case(
        water={"depth": 10.0},
        surface={"size": [12.0, 12.0], "spacing": 2.0},
        body=[{"name": "b", "form": "sphere", "radius": 2.0, "attitude": "m.csv"}],
        run={"duration": 20.0},
    ).placed(tmp_path)
    surveyed = survey(case)
    assert surveyed.periods.shortest == pytest.approx(2.0, rel=0.15)
    assert surveyed.layer is not None
    assert surveyed.mesh is not None
    moved = driving(surveyed, split(surveyed.mesh, False, (), 10.0))
    assert [m is not None for m in moved.motions[0]] == [k == 2 for k in range(6)]
    assert list(moved.parts) == ["radiated"]
    assert moved.motions[0][2].displacement(np.array([20.0 - 1.5]))[0] == pytest.approx(0.1, 1e-3)


BAD = {
    "a wrong header": ("t,surge\n0,0\n", "have the header 't,surge'; expected t,surge,sway,heave"),
    "a word": (",".join(HEADER) + "\n0,0,0,high,0,0,0\n", "line 2 .*reads '0,0,0,high,0,0,0'"),
    "a short row": (",".join(HEADER) + "\n0,0,0\n", "expected 7 numbers"),
    "few rows": (
        ",".join(HEADER) + "\n0,0,0,0,0,0,0\n1,0,0,0,0,0,0\n",
        "2 rows; expected at least",
    ),
    "nothing": ("", "have the header ''"),
}


@pytest.mark.parametrize("name", BAD)
def test_a_faulty_file_is_refused_in_a_sentence(name, tmp_path):
    text, sentence = BAD[name]
    (tmp_path / "m.csv").write_text(text)
    with pytest.raises(InputError, match=sentence):
        MotionFile(tmp_path / "m.csv", 10.0)


def test_times_that_stand_still_or_end_early_are_refused(tmp_path):
    late = write(tmp_path / "late.csv", np.linspace(0.5, 20.0, 50))
    with pytest.raises(InputError, match=r"run from t = 0\.5 to 20 s; expected them to cover"):
        MotionFile(late, 20.0)
    short = write(tmp_path / "short.csv", np.linspace(0.0, 19.0, 50))
    with pytest.raises(InputError, match="lengthen the file or shorten"):
        MotionFile(short, 20.0)
    twice = write(tmp_path / "twice.csv", np.array([0.0, 1.0, 2.0, 2.0, 3.0, 4.0, 5.0]))
    with pytest.raises(InputError, match=r"t = 2 s after one that is not earlier"):
        MotionFile(twice, 5.0)
    with pytest.raises(InputError, match="cannot be read"):
        MotionFile(tmp_path / "none.csv", 5.0)
