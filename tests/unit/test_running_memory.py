"""Route "grid": the memory that a plan tells against a run's peak, in processes of their own."""

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


def case(nodes, parts, sampled):
    """A ball in regular waves, held or heaved, in a sea of so many nodes a side; a few steps."""
    body = {"name": "ball", "form": "sphere", "radius": 6.0, "panel_size": 1.2}
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


@pytest.mark.long
@pytest.mark.parametrize(
    "asked", [(256, 1, 0), (512, 2, 1), (1024, 1, 0), (1024, 2, 1)], ids=lambda a: f"{a[0]}-{a[1]}"
)
def test_a_run_takes_what_its_plan_tells(tmp_path, asked):
    surveyed = survey(case(*asked))
    told = memory_of(surveyed)[2] + sampling_memory(surveyed)
    home = str(Path(bemwave.__file__).parents[1])
    command = [sys.executable, __file__, str(tmp_path / "run"), *map(str, asked)]
    done = subprocess.run(
        command, check=True, capture_output=True, text=True, env={"PYTHONPATH": home}
    )
    assert told == pytest.approx(int(done.stdout.split()[-1]), rel=0.1)


if __name__ == "__main__":
    bemwave.run(case(*map(int, sys.argv[2:])), sys.argv[1])
    print(1024 * resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)
