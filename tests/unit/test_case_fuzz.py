"""Whatever a case file holds, it is read or refused in words: no other error gets out."""

from __future__ import annotations

import contextlib
import io
import os
import re
import shutil
import time
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from bemwave.case import Case, read_case
from bemwave.case.faults import model_at
from bemwave.case.starter import STARTER
from bemwave.cli import status_of
from bemwave.errors import InputError
from bemwave.geometry import forms
from bemwave.geometry.files import write_mesh

SOUND: dict[str, Any] = {
    "water": {"depth": 10.0},
    "waves": [{"kind": "regular", "height": 0.1, "period": 3.0}],
    "surface": {"size": [40.0, 30.0], "spacing": 2.0, "edges": {"x_min": "wall"}},
    "wavemaker": [{"side": "x_min", "kind": "flap", "stroke": 0.1, "period": 3.0}],
    "body": [{"name": "buoy", "form": "sphere", "radius": 1.0, "damping_ratio": {"roll": 0.1}}],
    "hump": [{"height": 0.1, "width": 2.0}],
    "pressure": [{"head": 0.1, "width": 2.0}],
    "run": {"duration": 20.0, "history_region": {"size": [9.0, 9.0]}},
    "gauge": [{"position": [0.0, 0.0]}],
    "handoff": [{"box": {"size": [9.0, 9.0], "bottom": -5.0, "top": 1.0}, "every": 0.5}],
    "frames": {"formats": ["ply"]},
}
PLACES = [(table, None) for table in Case.model_fields] + [
    (table, key) for table in SOUND for key in [*model_at(Case, (table,)).model_fields, "nonsense"]
]
scalars = (
    st.integers(-(10**400), 10**400)
    | st.floats()
    | st.booleans()
    | st.text(max_size=4)
    | st.sampled_from(["auto", "deep", "bed", "fixed", "forced", "regular", "body:buoy", "x.csv"])
)
values = st.recursive(
    scalars,
    lambda inner: (
        st.lists(inner, max_size=3)
        | st.dictionaries(
            st.sampled_from(["size", "mode", "x_min", "roll", "no"]), inner, max_size=2
        )
    ),
    max_leaves=6,
)


@settings(deadline=None, max_examples=400)
@given(place=st.sampled_from(PLACES), value=values)
def test_any_value_at_any_key_is_taken_or_refused(
    place: tuple[str, str | None], value: Any
) -> None:
    table, key = place
    if key is None:
        changed = value
    elif isinstance(SOUND[table], list):
        changed = [SOUND[table][0] | {key: value}]
    else:
        changed = SOUND[table] | {key: value}
    with contextlib.suppress(InputError):
        assert Case(**(SOUND | {table: changed})).text


@settings(deadline=None, max_examples=200)
@given(data=st.data())
def test_a_file_with_a_piece_cut_out_is_taken_or_refused(data: st.DataObject, file: Path) -> None:
    start = data.draw(st.integers(0, len(STARTER)))
    end = data.draw(st.integers(start, min(start + 80, len(STARTER))))
    file.write_text(STARTER[:start] + STARTER[end:], encoding="utf-8")
    message = ""
    try:
        read_case(file)
    except InputError as error:
        message = str(error)
    assert all(line.startswith(str(file)) for line in message.splitlines())


@pytest.fixture(scope="module")
def file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("case") / "case.toml"


# what cases are put together from: tables that stand as they are, and other values for single
# keys; small, so that what is sound runs in a moment
BALL = {"name": '"ball"', "form": '"sphere"', "radius": "0.5", "panel_size": "0.3"}
PILE = {"name": '"pile"', "form": '"cylinder"', "radius": "0.4", "panel_size": "0.3"}
HULL = {"name": '"hull"', "mesh": '"hull.stl"', "panel_size": "0.3", "position": "[0.2, 0.1]"}
ROLL = {"attitude": '"forced"', "forced": '{ mode = "roll", amplitude = 3.0, period = 1.5 }'}
SEA = {"height": "0.1", "period": "1.5"}
DRAWN = SEA | {"components": "9"}
TABLES: dict[str, list[dict[str, str]]] = {
    "[water]": [{"depth": "2.0"}, {"depth": '"deep"'}],
    "[[waves]]": [
        {"kind": '"regular"'} | SEA,
        *({"kind": f'"{kind}"'} | DRAWN for kind in ("jonswap", "tma", "pierson-moskowitz")),
        {"kind": '"group"', "spectrum": '"jonswap"', "focus": "[0.0, 0.0, 1.0]"} | DRAWN,
        {"kind": '"table"', "file": '"table.csv"', "components": "9"},
    ],
    "[surface]": [
        {"size": "[4.0, 3.0]", "spacing": "0.7", "absorber": "1.5"},
        {"size": "[4.0, 3.0]", "spacing": "0.7", "edges": '"wall"'},
        {"size": "4.0", "spacing": "0.7", "outline": '"circle"', "absorber": "1.5"},
        {"size": "[6.0, 5.0]", "spacing": "0.25", "route": '"grid"', "absorber": "1.5"},
    ],
    "[[body]]": [
        BALL,
        BALL | {"centre_depth": "1.0"},
        BALL | {"attitude": '"motions.csv"'},
        PILE | {"draught": "0.4"} | ROLL,
        PILE | {"draught": '"bed"'},
        {"name": '"b"', "form": '"box"', "length": "1.0", "beam": "0.8", "draught": "0.3"},
        HULL,
        HULL | {"attitude": '"follow"'},
    ],
    "[run]": [{"duration": "1.0"}, {"duration": "0.5", "ramp": "0"}],
    "[[wavemaker]]": [{"side": '"x_min"', "kind": '"flap"', "stroke": "0.1", "period": "2.0"}],
    "[[hump]]": [{"height": "0.1", "width": "0.6"}],
    "[[pressure]]": [{"head": "0.1", "width": "0.5"}],
    "[[gauge]]": [{"position": "[1.0, 0.5]"}],
    "[[handoff]]": [
        {"box": "{ size = [1.0, 1.0], bottom = -0.5, top = 0.2 }"},
        {"points": '"points.csv"'},
    ],
    "[frames]": [
        {"formats": '["ply"]', "fps": "4"},
        {"formats": '["usd", "vtk"]', "fps": "4", "region": "{ size = [2.0, 1.0] }"},
    ],
}
KEYS = {
    "[water]": {"depth": ["0.3"], "gravity": ["1.0"], "density": ["1e3"]},
    "[[waves]]": {
        "heading": ["30.0", "1e9"],
        "spreading": ["10.0"],
        "components": ["3", "40"],
        "band": ["[1.0, 2.0]", "[2.0, 1.0]"],
        "file": ['"hull.stl"', '"no.csv"'],
    },
    "[surface]": {
        "size": ["[6.0, 5.0]", "4.0"],
        "spacing": ["0.25", "0.5"],
        "route": ['"auto"', '"panels"', '"grid"'],
        "centre": ["[9.0, 0.0]"],
        "fine_spacing": ["0.3"],
        "edges": ['"absorb"', '{ x_min = "wall" }', '{ x_min = "wall", y_min = "wall" }'],
        "absorber": ["0.1", '"auto"'],
        "mesh": ['"hull.stl"'],
    },
    "[[body]]": {
        "name": ['"a/b"'],
        "mesh": ['"points.csv"', '"../hull.stl"'],
        "form": ['"box"', '"wigley"', '"columns"'],
        "radius": ["0.4"],
        "draught": ["0.4", '"bed"'],
        "centre_depth": ["-0.1"],
        "panel_size": ["0.2", "0.4"],
        "position": ["[0.5, 0.2]", "[2.0, 0.0]"],
        "heading": ["33.0"],
        "trim": ["5.0"],
        "heel": ["9.0"],
        "without": ['["piece2"]'],
        "path": ["1.0"],
        "attitude": ['"fixed"', '"follow"', '"motions.csv"', '"floating"'],
        "forced": ['{ mode = "surge", amplitude = 0.1, period = 0.1 }'],
    },
    "[run]": {
        "duration": ["2.0"],
        "step": ["0.01", "0.1"],
        "ramp": ["0.5"],
        "record_every": ["0.25", "0.3"],
        "checkpoint_every": ["0.01"],
        "precision": ['"single"'],
        "memory_limit": ["0.1", "0.5"],
        "history_region": ["{ size = [2.0, 2.0] }"],
    },
    "[[wavemaker]]": {"side": ['"y_max"'], "kind": ['"piston"'], "period": ["0.2"]},
    "[[hump]]": {"centre": ["[1.0, 0.0]"], "width": ["0.1", "3.0"], "height": ["9.0"]},
    "[[pressure]]": {"centre": ["[1.0, 0.0]"], "velocity": ["[2.0, 0.0]"]},
    "[[gauge]]": {"position": ["[0.0, 0.0]", "[99.0, 0.0]"], "deck": ["1.0"], "name": ['"a"']},
    "[[handoff]]": {
        "box": ["{ size = [3.0, 2.0], bottom = -1.0, top = 0.5, angle = 20.0 }"],
        "spacing": ["0.5", "[0.3, 0.2]"],
        "every": ["0.1", "0.3"],
        "start": ["0.5"],
        "end": ["0.25", "1.0"],
        "zone": ["0.2", "9.0"],
        "crest": ['"wheeler"', '"cut"'],
        "field": ['"parts"', '"incident"'],
        "volume_at_start": ["true"],
        "place": ['{ up = "y", heading = 30.0 }'],
        "name": ['"a"', '"../b"'],
    },
    "[frames]": {
        "formats": ['["obj", "glb"]', "[]"],
        "fps": ["2", "1e9"],
        "start": ["0.5"],
        "end": ["0.75"],
        "region": ["{ size = [2.0, 1.0] }", "{ size = [99.0, 1.0] }"],
        "spacing": ["0.2", "0.02"],
        "detail": ["false"],
        "horizontal_displacement": ["true"],
        "shading": ["true"],
        "waterline": ['"skirt"', '"cut"'],
        "loop": ["0.5"],
        "displacement_maps": ["true"],
    },
}
NUMBERS = ["0", "-1.0", "1e300", "1e-300", "1e-5", "1e5", "nan", "inf", "[1e9, 1]"]


def text_of(tables: dict[str, dict[str, str]]) -> str:
    """A case file of tables, each with its keys as they are written."""
    return "".join(
        f"{name}\n" + "".join(f"{key} = {value}\n" for key, value in keys.items())
        for name, keys in tables.items()
    )


@st.composite
def texts(draw: st.DrawFn) -> str:
    """Case files: put together of tables, or the starter; with other values, and with slips."""
    names = ["[water]", "[surface]", "[run]"]
    names += draw(st.lists(st.sampled_from(list(TABLES)), max_size=4))
    tables = {name: draw(st.sampled_from(TABLES[name])) for name in names}
    for _ in range(draw(st.integers(0, 3))):
        name = draw(st.sampled_from(names))
        key = draw(st.sampled_from(list(KEYS[name])))
        value = draw(st.sampled_from(KEYS[name][key] * 4 + NUMBERS))
        tables[name] = tables[name] | {key: value}
    text = text_of(tables) if draw(st.integers(1, 20)) < 20 else STARTER
    for _ in range(draw(st.sampled_from([0, 0, 0, 0, 0, 0, 0, 1, 2]))):
        start = draw(st.integers(0, len(text)))
        length = draw(st.integers(0, 6))
        text = text[:start] + draw(st.text(max_size=3)) + text[start + length :]
    return text


def quickly(*arguments: str) -> tuple[int, str, str]:
    """Exit code and what was told of a command, which must not take long."""
    begun, asleep = cpu_seconds(), time.monotonic()
    with (
        contextlib.redirect_stdout(io.StringIO()) as out,
        contextlib.redirect_stderr(io.StringIO()) as err,
    ):
        status = status_of(arguments)
    # of its own: another program on the machine may have the cores meanwhile
    assert cpu_seconds() - begun < 10.0, out.getvalue()
    assert time.monotonic() - asleep < 60.0, out.getvalue()
    return status, out.getvalue(), err.getvalue()


def cpu_seconds() -> float:
    """Of this process and of those it started and saw end."""
    return sum(os.times()[:4])


def try_case(text: str, home: Path) -> None:
    """Plan a case, and run it where it is small: results or a refusal in words, no more."""
    path, out = home / "case.toml", home / "run"
    path.write_bytes(text.encode("utf-8", "surrogatepass"))
    status, told, complaint = quickly("plan", str(path))
    assert status in (0, 2)
    assert (status == 2) == complaint.startswith("error: ")
    if status == 0 and planned_seconds(told) < 3.0:  # a slip may make a case that takes hours
        shutil.rmtree(out, ignore_errors=True)
        status, told, complaint = quickly("run", str(path), "--out", str(out))
        assert status in (0, 2, 3), told
        assert (status != 0) == complaint.startswith("error: ")
        assert out.exists() == (status != 2)


def planned_seconds(told: str) -> float:
    """All that a plan says a case will take."""
    line = next(line for line in told.splitlines() if line.startswith("time "))
    spans = re.findall(r"(\S+) (s|min) to", line)
    assert len(spans) == 3
    return sum(float(number) * {"s": 1.0, "min": 60.0}[unit] for number, unit in spans)


@pytest.fixture(scope="module")
def home(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the files that cases name; kernels are compiled, which takes its time."""
    home = tmp_path_factory.mktemp("cases")
    rows = [f"{0.1 * n:.1f},0,0,{0.01 * (n % 5)},0,0,0" for n in range(25)]
    (home / "motions.csv").write_text("t,surge,sway,heave,roll,pitch,yaw\n" + "\n".join(rows))
    (home / "points.csv").write_text("x,y,z\n1.0,0.5,-0.2\n1.0,0.6,-0.2\n")
    (home / "table.csv").write_text(
        "frequency_rad_s,density_m2s\n3.0,0.001\n4.0,0.002\n5.0,0.001\n"
    )
    write_mesh(forms.box(1.0, 0.8, 0.3, 0.25).flipped(), home / "hull.stl")
    for number, surface in enumerate(TABLES["[surface]"]):
        tables = {name: TABLES[name][0] for name in ("[water]", "[[body]]", "[run]", "[[gauge]]")}
        (home / "first.toml").write_text(text_of(tables | {"[surface]": surface}))
        asked = ["run", str(home / "first.toml"), "--out", str(home / f"first{number}")]
        assert status_of(asked) == 0
    return home


WATER, OPEN, SHORT = TABLES["[water]"][0], TABLES["[surface]"][0], {"duration": "0.5"}
FOUND = {  # what once ended in a traceback, or without end
    "hump and rider": {"[[body]]": HULL | {"attitude": '"follow"'}, "[[hump]]": {}},
    "no start-up": {"[run]": SHORT | {"ramp": "1e-300"}, "[[body]]": PILE | ROLL},
    "no step": {"[run]": SHORT | {"step": "1e-300"}, "[[hump]]": {}},
    "endless depth": {"[water]": {"depth": "1e300"}, "[[hump]]": {}},
    "no absorber": {"[surface]": OPEN | {"absorber": "1e-5"}, "[[hump]]": {}},
    "swift patch": {"[[pressure]]": {"head": "0.1", "width": "1.0", "velocity": "[1e9, 1]"}},
    "no squares": {"[surface]": OPEN | {"fine_spacing": "1e-300"}, "[[body]]": BALL},
}


@pytest.mark.parametrize("name", FOUND)
def test_what_was_found_once_runs_or_is_refused(name: str, home: Path) -> None:
    tables = {"[water]": WATER, "[surface]": OPEN, "[run]": SHORT}
    for table, keys in FOUND[name].items():
        tables[table] = keys or TABLES[table][0]
    try_case(text_of(tables), home)


@settings(deadline=None, max_examples=100, suppress_health_check=list(HealthCheck))
@given(text=texts())
def test_a_case_put_together_at_random_runs_or_is_refused(text: str, home: Path) -> None:
    try_case(text, home)


@pytest.mark.long
@settings(deadline=None, max_examples=5000, suppress_health_check=list(HealthCheck))
@given(text=texts())
def test_five_thousand_cases_run_or_are_refused(text: str, home: Path) -> None:
    try_case(text, home)
