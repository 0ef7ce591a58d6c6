"""A small run with a bit of everything, and its page."""

import shutil

import pytest

import bemwave
from bemwave.report import write_report

TITLE = '<script>alert("sea")</script> & <b>waves</b> of $x^2$ & </title>'
BUOY = {
    "name": "buoy",
    "form": "sphere",
    "radius": 0.6,
    "centre_depth": 1.5,
    "panel_size": 0.3,
    "attitude": "forced",
    "forced": {"mode": "heave", "amplitude": 0.1, "period": 2.0},
}
MARK = {
    "name": "mark",
    "form": "cylinder",
    "radius": 0.3,
    "draught": 0.3,
    "position": [2.0, 1.2],
    "attitude": "follow",
}
CASE = {
    "title": TITLE,
    "water": {"depth": "deep"},
    "waves": [{"kind": "regular", "height": 0.2, "period": 2.0}],
    "surface": {"size": [7.0, 5.0], "spacing": 0.6},
    "body": [MARK, BUOY],
    "run": {"duration": 6.0, "record_every": 0.1},
    "gauge": [{"name": "ahead", "position": [-2.0, 0.0]}, {"name": "over", "position": [0.0, 0.0]}],
    "handoff": [
        {
            "name": "tank",
            "box": {"size": [5.0, 4.0], "bottom": -2.5, "top": 0.5},
            "spacing": [0.5, 0.5],
            "every": 0.2,
            "start": 4.0,
        }
    ],
}


@pytest.fixture(scope="session")
def finished(tmp_path_factory):
    """The run folder of a finished run; not to be changed."""
    folder = tmp_path_factory.mktemp("report") / "run"
    bemwave.run(bemwave.Case(**CASE), folder)
    return folder


@pytest.fixture(scope="session")
def page(finished):
    """Its page."""
    return write_report(finished)


@pytest.fixture(scope="session")
def sea_alone(tmp_path_factory):
    """The page of a run in which nothing had to be solved, on round water."""
    case = bemwave.Case(
        water={"depth": 10.0},
        waves=[{"kind": "jonswap", "height": 0.5, "period": 4.0, "components": 30}],
        surface={"size": 40.0, "spacing": 2.0, "outline": "circle"},
        run={"duration": 8.0},
    )
    folder = tmp_path_factory.mktemp("sea") / "run"
    bemwave.run(case, folder)
    return write_report(folder)


@pytest.fixture
def own(finished, tmp_path):
    """A copy of the run folder that a test may change."""
    return shutil.copytree(finished, tmp_path / "run")
