"""Whatever a case file holds, it is read or refused in words: no other error gets out."""

from __future__ import annotations

import contextlib
import io
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


# pieces that a case is put together from, sound and not: small, so that what is sound runs in a
# moment
PIECES = [
    *("[water]\n", "depth = 2.0\n", 'depth = "deep"\n', "density = 1e3\n", "gravity = 1.0\n"),
    *("[surface]\n", "size = [4.0, 3.0]\n", "spacing = 0.7\n", 'edges = "wall"\n', "size = 4.0\n"),
    *('outline = "circle"\n', "absorber = 1.0\n", "centre = [9.0, 0.0]\n", "fine_spacing = 0.5\n"),
    *("[run]\n", "duration = 1.0\n", "step = 0.01\n", "record_every = 0.25\n", "ramp = 0\n"),
    *("memory_limit = 0.1\n", "duration = 1e300\n", "record_every = 1e-300\n"),
    *("[[waves]]\n", 'kind = "regular"\nheight = 0.1\nperiod = 1.5\n', "heading = 1e9\n"),
    *('kind = "jonswap"\nheight = 0.1\nperiod = 1.5\n', "components = 3\n", "band = [2.0, 1.0]\n"),
    *("[[hump]]\n", "height = 0.1\nwidth = 0.6\n", "[[pressure]]\n", "head = 0.1\nwidth = 0.5\n"),
    *("[[gauge]]\n", "position = [0.0, 0.0]\n", "position = [99.0, 0.0]\n", 'name = "a"\n'),
    *("[[handoff]]\n", "box = {size = [1.0, 1.0], bottom = -0.5, top = 0.2}\n", "every = 0.5\n"),
    *("start = 0.5\n", "end = 0.25\n", "zone = 9.0\n", 'points = "no.csv"\n', "spacing = 0.5\n"),
    *("[frames]\n", 'formats = ["ply"]\n', "fps = 2\n", "fps = 1e9\n", "loop = 1.0\n"),
    *("[[wavemaker]]\n", 'side = "x_min"\nkind = "flap"\nstroke = 0.1\nperiod = 2.0\n'),
    *('edges = {x_min = "wall"}\n', "[[body]]\n", 'mesh = "no.stl"\n', 'name = "b"\n'),
    *(
        "\x00",
        '"',
        "[",
        "= 1\n",
        "a.b.c = 1\n",
        "height = nan\n",
        "depth = 1e-300\n",
        "depth = inf\n",
    ),
]
BASES = [
    "[water]\ndepth = 2.0\n[surface]\nsize = [4.0, 3.0]\nspacing = 0.7\n[run]\nduration = 1.0\n",
    STARTER,
]


def try_case(data: st.DataObject, home: Path) -> None:
    """Put a case together, mutate it, plan it, and run it where it was planned: words, no more."""
    base = data.draw(st.sampled_from(BASES))
    pieces = data.draw(st.lists(st.sampled_from(PIECES), max_size=8))
    text = base + "".join(pieces)
    for _ in range(data.draw(st.integers(0, 2))):
        start = data.draw(st.integers(0, len(text)))
        length = data.draw(st.integers(0, 6))
        text = text[:start] + data.draw(st.text(max_size=3)) + text[start + length :]
    path = home / "case.toml"
    path.write_bytes(text.encode("utf-8", "surrogatepass"))
    begun = time.monotonic()
    arguments = ["plan", str(path)]
    told = io.StringIO()
    with contextlib.redirect_stderr(told), contextlib.redirect_stdout(io.StringIO()):
        status = status_of(arguments)
    assert status in (0, 2)
    assert (status == 2) == told.getvalue().startswith("error: ")
    if status == 0 and text.startswith(BASES[0]):  # the starter takes a while to run
        out = home / "run"
        shutil.rmtree(out, ignore_errors=True)
        with contextlib.redirect_stderr(told), contextlib.redirect_stdout(io.StringIO()):
            status = status_of(["run", str(path), "--out", str(out)])
        assert status in (0, 2, 3), told.getvalue()
        assert out.exists() == (status != 2)
    assert time.monotonic() - begun < 60.0  # a hang; the rest is a busy machine


@pytest.fixture(scope="module")
def home(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("cases")


@settings(deadline=None, max_examples=40, suppress_health_check=list(HealthCheck))
@given(data=st.data())
def test_a_case_put_together_at_random_runs_or_is_refused(data: st.DataObject, home: Path) -> None:
    try_case(data, home)


@pytest.mark.long
@settings(deadline=None, max_examples=5000, suppress_health_check=list(HealthCheck))
@given(data=st.data())
def test_five_thousand_cases_run_or_are_refused(data: st.DataObject, home: Path) -> None:
    try_case(data, home)
