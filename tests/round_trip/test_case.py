"""A case made in Python, written as TOML and read again, is the same case."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from bemwave.case import Case, read_case
from bemwave.case.starter import STARTER

number = st.floats(-1e3, 1e3, allow_subnormal=False)
above_0 = st.floats(1e-3, 1e3)
word = st.text(st.characters(exclude_categories=["Cs"]), max_size=20)
file_name = word.filter(bool)
triple = st.tuples(number, number, number)
small = st.tuples(st.floats(-5, 5), st.floats(-5, 5))
one_of = st.sampled_from


def waves() -> st.SearchStrategy[dict[str, Any]]:
    height, period = st.floats(1e-4, 0.1), st.floats(2.0, 30.0)
    regular = st.fixed_dictionaries(
        {"kind": st.just("regular"), "height": height, "period": period},
        optional={"heading": number, "phase": number},
    )
    drawn: dict[str, st.SearchStrategy[Any]] = {
        "heading": number,
        "spreading": above_0,
        "components": st.integers(1, 10**5),
        "seed": st.integers(0, 2**64 - 1),
        "band": st.tuples(st.floats(0.1, 0.9), st.floats(1.0, 9.0)),
        "peakedness": above_0,
    }
    spectrum = st.fixed_dictionaries(
        {"kind": st.just("jonswap"), "height": height, "period": period},
        optional=drawn | {"random_amplitudes": st.booleans()},
    )
    group = st.fixed_dictionaries(
        {
            "kind": st.just("group"),
            "height": height,
            "period": period,
            "spectrum": one_of(["jonswap", "pierson-moskowitz", "tma"]),
            "focus": triple,
        },
        optional=drawn,
    )
    table = st.fixed_dictionaries({"kind": st.just("table"), "file": file_name})
    return regular | spectrum | group | table


def bodies() -> st.SearchStrategy[dict[str, Any]]:
    placed: dict[str, st.SearchStrategy[Any]] = {
        "position": small,
        "heading": number,
        "panel_size": above_0,
        "mass": above_0,
        "centre_of_mass": triple,
        "stiffness": st.tuples(*[number] * 6),
        "damping_ratio": st.dictionaries(one_of(["heave", "roll"]), above_0),
        "path": st.just("fixed") | number | st.just("track.csv"),
    }
    mesh = st.fixed_dictionaries(
        {"mesh": file_name},
        optional=placed
        | {"up": one_of(["x", "y", "z"]), "without": st.lists(word), "draught": above_0},
    )
    cylinder = st.fixed_dictionaries(
        {"form": st.just("cylinder"), "radius": above_0, "draught": above_0 | st.just("bed")},
        optional=placed,
    )
    forced = st.fixed_dictionaries(
        {
            "form": st.just("sphere"),
            "radius": above_0,
            "attitude": st.just("forced"),
            "forced": st.fixed_dictionaries(
                {"mode": st.just("heave"), "amplitude": number, "period": above_0}
            ),
        },
        optional=placed,
    )
    return mesh | cylinder | forced


def handoffs() -> st.SearchStrategy[dict[str, Any]]:
    box = st.fixed_dictionaries(
        {
            "size": st.tuples(st.floats(1, 10), st.floats(1, 10)),
            "bottom": st.floats(-9, -1),
            "top": st.floats(-0.5, 9),
        },
        optional={"centre": small, "angle": number},
    )
    place = st.fixed_dictionaries({}, optional={"origin": triple, "time_zero": number})
    times: dict[str, st.SearchStrategy[Any]] = {
        "start": st.floats(0, 9.0),
        "end": st.floats(10.0, 20.0),
        "crest": one_of(["linear", "wheeler", "cut"]),
        "field": one_of(["total", "incident", "parts"]),
        "place": place,
    }
    boxes = st.fixed_dictionaries(
        {"box": box},
        optional=times
        | {
            "spacing": above_0 | st.tuples(above_0, above_0),
            "zone": st.floats(0, 0.5),
            "volume_at_start": st.booleans(),
        },
    )
    points = st.fixed_dictionaries({"points": file_name}, optional=times)
    return boxes | points


@st.composite
def cases(draw: st.DrawFn) -> dict[str, Any]:
    side = one_of(["absorb", "wall"])
    edges = side | st.fixed_dictionaries({}, optional={"x_min": side, "y_max": side})
    tables: dict[str, Any] = {
        "water": draw(
            st.fixed_dictionaries(
                {"depth": st.floats(10.0, 1e4)}, optional={"density": above_0, "current": small}
            )
        ),
        "surface": draw(
            st.fixed_dictionaries(
                {"size": st.tuples(st.floats(40, 99), st.floats(40, 99)), "spacing": st.just(2)},
                optional={"edges": edges, "absorber": st.just("auto") | above_0},
            )
        ),
        "run": {"duration": 20.0} | draw(one_of([{}, {"record_every": 0.5}, {"ramp": 0}])),
        "body": draw(st.lists(bodies(), max_size=2)),
        "handoff": draw(st.lists(handoffs(), max_size=2)),
        "hump": draw(
            st.lists(st.fixed_dictionaries({"height": number, "width": above_0}), max_size=1)
        ),
        "gauge": draw(st.lists(st.fixed_dictionaries({"position": small}), max_size=2)),
    }
    for index, body in enumerate(tables["body"]):
        body["name"] = f"body{index}"
    if tables["surface"].get("edges") != "wall":
        tables["waves"] = draw(st.lists(waves(), max_size=2))
    if draw(st.booleans()):
        tables["title"] = draw(word)
    if draw(st.booleans()):
        tables["frames"] = draw(
            st.fixed_dictionaries(
                {},
                optional={
                    "fps": above_0,
                    "formats": st.lists(
                        st.sampled_from(["usd", "ply", "obj", "vtk", "glb"]), min_size=1
                    ),
                    "detail": st.booleans(),
                    "shading": st.booleans(),
                    "horizontal_displacement": st.booleans(),
                    "loop": above_0,
                },
            )
        )
    return tables


@pytest.fixture(scope="module")
def file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("case") / "case.toml"


@settings(deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(tables=cases())
def test_written_and_read_again_a_case_is_the_same(tables: dict[str, Any], file: Path) -> None:
    made = Case(**tables)
    file.write_text(made.text, encoding="utf-8", newline="")
    again = read_case(file)
    assert again.model_dump() == made.model_dump()
    assert again.text == made.text


@settings(deadline=None)
@given(title=word)
def test_any_text_is_written_so_that_tomllib_reads_it(title: str) -> None:
    case = Case(
        title=title,
        water={"depth": "deep"},
        surface={"size": [40.0, 30.0], "spacing": 2.0},
        run={"duration": 20.0},
    )
    assert tomllib.loads(case.text) == {
        "title": title,
        "water": {"depth": "deep"},
        "surface": {"size": [40.0, 30.0], "spacing": 2.0},
        "run": {"duration": 20.0},
    }


def test_the_starter_case_comes_back_from_its_values(file: Path) -> None:
    file.write_text(STARTER, encoding="utf-8")
    case = read_case(file)
    file.write_text(Case(**case.model_dump(exclude_unset=True)).text, encoding="utf-8")
    assert read_case(file).model_dump() == case.model_dump()
