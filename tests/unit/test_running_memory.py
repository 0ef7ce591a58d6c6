"""The memory that a plan tells against a run's peak, in processes of their own; both routes."""

import ast
import resource
import subprocess
import sys
from pathlib import Path

import pytest

import bemwave
from bemwave.case import Case
from bemwave.running.budget import memory_of
from bemwave.running.sampling import sampling_memory
from bemwave.running.survey import survey


def on_panels(spacing, edges):
    """A held ball in regular waves, beside a wall or not, or beside a mound let go in a basin."""
    ball = {"name": "ball", "form": "sphere", "radius": 4.0, "panel_size": 1.2}
    tables = {
        "water": {"depth": "deep" if edges == "open" else 8.0},
        "surface": {"size": [40.0, 30.0], "spacing": spacing, "route": "panels"},
        "body": [ball],
        "run": {"duration": 0.5, "record_every": 0.5},
    }
    if edges == "closed":
        tables["surface"] |= {"size": [60.0, 40.0], "edges": "wall"}
        tables["hump"] = [{"height": 0.5, "width": 4.0, "centre": [-15.0, 0.0]}]
    else:
        tables["surface"] |= {"absorber": 20.0}
        tables["waves"] = [{"kind": "regular", "height": 0.5, "period": 3.0}]
    if edges == "mirror":
        tables["surface"] |= {"edges": {"x_min": "wall"}}
    return Case(**tables)


def on_grid(nodes, parts, sampled, panel_size=1.2):
    """A ball in regular waves, held or heaved, in a sea of so many nodes a side; a few steps."""
    body = {"name": "ball", "form": "sphere", "radius": 6.0, "panel_size": panel_size}
    if parts == 2:
        forced = {"mode": "heave", "amplitude": 0.1, "period": 3.0}
        body |= {"attitude": "forced", "forced": forced}
    side = nodes - 120.0
    tables = {
        "water": {"depth": "deep"},
        "surface": {"size": [side, side], "spacing": 1.0, "absorber": 60.0, "route": "grid"},
        "waves": [{"kind": "regular", "height": 0.5, "period": 3.0}],
        "body": [body],
        "run": {
            "duration": 1.0,
            "record_every": 1.0,
            "history_region": {"size": [50.0, 50.0]},
        },
    }
    if sampled:
        tables["gauge"] = [{"name": "near", "position": [10.0, 2.0]}]
        tables["handoff"] = [{"box": {"size": [20.0, 20.0], "bottom": -6.0, "top": 2.0}}]
    return Case(**tables)


MAKE = {"panels": on_panels, "grid": on_grid}
SIZES = [
    ("panels", 1.4, "open"),
    ("panels", 1.1, "open"),
    ("panels", 1.4, "mirror"),
    ("panels", 1.4, "closed"),
    ("panels", 1.1, "closed"),
    ("grid", 256, 1, 0),
    ("grid", 256, 1, 0, 0.45),
    ("grid", 512, 2, 1),
    ("grid", 1024, 1, 0),
    ("grid", 1024, 2, 1),
    ("grid", 2048, 2, 1),
]


@pytest.mark.long
@pytest.mark.parametrize("asked", SIZES, ids=lambda asked: "-".join(map(str, asked)))
def test_a_run_takes_what_its_plan_tells(tmp_path, asked):
    route, *size = asked
    surveyed = survey(MAKE[route](*size))
    told = memory_of(surveyed)[2] + sampling_memory(surveyed)
    home = str(Path(bemwave.__file__).parents[1])
    command = [sys.executable, __file__, str(tmp_path / "run"), repr(asked)]
    done = subprocess.run(
        command, check=True, capture_output=True, text=True, env={"PYTHONPATH": home}
    )
    taken = int(done.stdout.split()[-1])
    print(f"told {told / 1e9:.3g} GB, taken {taken / 1e9:.3g} GB: {told / taken - 1:+.1%}")
    assert told == pytest.approx(taken, rel=0.1)


if __name__ == "__main__":
    route, *size = ast.literal_eval(sys.argv[2])
    bemwave.run(MAKE[route](*size), sys.argv[1])
    print(1024 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)
