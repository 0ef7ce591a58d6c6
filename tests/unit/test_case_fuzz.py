"""Whatever a case file holds, it is read or refused in words: no other error gets out."""

from __future__ import annotations

import contextlib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from bemwave.case import Case, read_case
from bemwave.case.faults import model_at
from bemwave.case.starter import STARTER
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
