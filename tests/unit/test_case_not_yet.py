"""What the format knows and this version does not do is read, and refused before a run."""

from __future__ import annotations

from typing import Any

import pytest

from bemwave.case import Case, refuse_not_yet
from bemwave.errors import NotYetError

BOX = {"size": [10.0, 10.0], "bottom": -5.0, "top": 1.0}
SPHERE = {"name": "buoy", "form": "sphere", "radius": 2.0}

LATER: dict[str, dict[str, Any]] = {
    "current": {"water": {"depth": 10.0, "current": [0.5, 0.0]}},
    "path": {"body": [SPHERE | {"path": 2.0}]},
    'attitude = "floating"': {"body": [SPHERE | {"attitude": "floating", "free": ["heave"]}]},
    'axes = "body:buoy"': {"body": [SPHERE], "handoff": [{"box": BOX, "axes": "body:buoy"}]},
    'format = "csv"': {"handoff": [{"box": BOX, "format": "csv"}]},
    'layout = "lattice"': {"handoff": [{"box": BOX, "layout": "lattice"}]},
    "average": {"handoff": [{"box": BOX, "average": True}]},
    "balance": {"handoff": [{"box": BOX, "balance": True}]},
}


@pytest.mark.parametrize("key", LATER)
def test_what_comes_later_is_refused_by_name(key: str) -> None:
    least = {
        "water": {"depth": 10.0},
        "surface": {"size": [40.0, 30.0], "spacing": 2.0},
        "run": {"duration": 20.0},
    }
    case = Case(**(least | LATER[key]))
    with pytest.raises(NotYetError, match=r"^not yet: ") as caught:
        refuse_not_yet(case)
    assert key in str(caught.value)
    assert "later version" in str(caught.value)
