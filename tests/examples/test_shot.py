"""The shot for the screen: planned so that it can be trusted, and run to a whole file."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from bemwave import cli
from bemwave.case import read_case
from bemwave.running import run
from bemwave.running.forecast import forecasts, trustworthy_from
from bemwave.running.frames_output import shares
from bemwave.running.survey import survey

CASE = Path(cli.__file__).parents[1] / "examples" / "tender_shot.toml"


@pytest.mark.usefixtures("needs_gmsh")
def test_the_shot_starts_when_it_can_be_trusted_and_has_detail() -> None:
    surveyed = survey(read_case(CASE))
    frames = surveyed.case.frames
    assert frames is not None
    assert frames.start >= trustworthy_from(surveyed)
    assert forecasts(surveyed)["reflection"] < 0.02  # the limit of the check
    assert 0.1 < shares(surveyed)["frames_share_added"] < 0.25
    assert surveyed.motion_files[0] is not None
    assert surveyed.hulls[0].whole is not None  # its topsides are drawn
    assert surveyed.hulls[0].whole.points[:, 2].max() > 2.0


@pytest.mark.slow
@pytest.mark.usefixtures("needs_gmsh")
def test_the_shot_is_one_file_of_two_seconds(tmp_path: Path) -> None:
    usd = pytest.importorskip("pxr.Usd")
    done = run(read_case(CASE), tmp_path / "run")
    verdicts = json.loads(done.folder.checks.read_text(encoding="utf-8"))
    assert not [v["name"] for v in verdicts if v["verdict"] == "fail"]
    stage = usd.Stage.Open(str(done.folder.frames / "surface.usdc"))
    assert (stage.GetStartTimeCode(), stage.GetEndTimeCode()) == (1.0, 49.0)
    points = stage.GetPrimAtPath("/sea/water").GetAttribute("points")
    assert len(points.GetTimeSamples()) == 49
