"""Each kind of wrong case file: its sentence, exit code 2, and nothing written."""

from __future__ import annotations

from pathlib import Path

import pytest

from bemwave.cli import status_of

GOOD = """\
title = "A barge in a tank"
[water]
depth = 10.0
[[waves]]
kind = "regular"
height = 0.3
period = 3.5
[surface]
size = [40.0, 30.0]
spacing = 1.5
[[body]]
name = "barge"
form = "box"
length = 8.0
beam = 4.0
draught = 1.0
[run]
duration = 20.0
[[gauge]]
name = "bow"
position = [8.0, 0.0]
[[handoff]]
name = "near"
box = { size = [20.0, 14.0], bottom = -6.0, top = 2.0 }
every = 0.5
"""

SPECTRUM = 'kind = "jonswap"\nheight = 0.3\nperiod = 3.5'
REGULAR = 'kind = "regular"\nheight = 0.3\nperiod = 3.5'

# what is replaced, by what, the line told, the sentence
BAD = {
    "zero spacing": (
        "spacing = 1.5", "spacing = 0",
        10, "[surface] spacing: got 0, expected a number above 0",
    ),
    "negative depth": (
        "depth = 10.0", "depth = -10",
        3, '[water] depth: got -10, expected a number above 0 in metres, or "deep"',
    ),
    "not a number": (
        "height = 0.3", "height = nan",
        6, "[[waves]] height: got nan, expected a number above 0",
    ),
    "infinite": (
        "duration = 20.0", "duration = inf",
        18, "[run] duration: got inf, expected a number above 0",
    ),
    "text for a number": (
        "height = 0.3", 'height = "high"',
        6, '[[waves]] height: got "high", expected a number above 0',
    ),
    "yes for a number": (
        "period = 3.5", "period = true",
        7, "[[waves]] period: got true, expected a number above 0",
    ),
    "number for a text": (
        'title = "A barge in a tank"', "title = 7",
        1, "title: got 7, expected a text in quotes",
    ),
    "unknown key": (
        "spacing = 1.5", "spacng = 1.5\nspacing = 1.5",
        10, '[surface] spacng: unknown key, did you mean "spacing"?',
    ),
    "unknown key, none near": (
        "depth = 10.0", "depth = 10.0\nviscosity = 1",
        4, "[water] viscosity: unknown key; the keys here are depth, density, gravity, current",
    ),
    "unknown table": (
        "[[waves]]", "[[wave]]",
        4, "[[wave]]: unknown table, did you mean [[waves]]?",
    ),
    "single brackets": (
        "[[gauge]]", "[gauge]",
        19, "[gauge]: got one table [gauge], expected a list of tables, each under [[gauge]]",
    ),
    "double brackets": (
        "[run]", "[[run]]",
        17, "[[run]]: got a list of tables [[run]], expected one table [run]",
    ),
    "missing key": (
        "duration = 20.0\n", "",
        17, "[run] duration: missing; expected a number above 0",
    ),
    "missing table": (
        "[surface]\nsize = [40.0, 30.0]\nspacing = 1.5\n", "",
        None, "surface: missing; expected a table [surface] with size, spacing",
    ),
    "unknown word": (
        'kind = "regular"', 'kind = "jonswop"',
        5, '[[waves]] kind: got "jonswop", expected "regular", "jonswap", "pierson-moskowitz", '
        '"tma", "group" or "table"; did you mean "jonswap"?',
    ),
    "too few numbers": (
        "size = [40.0, 30.0]", "size = [40.0]",
        9, "[surface] size: got [40.0], expected two numbers above 0, [along x, along y], or for "
        "a circle its diameter",
    ),
    "circle with two sizes": (
        "spacing = 1.5", 'spacing = 1.5\noutline = "circle"',
        9, "[surface] size: got [40.0, 30.0], expected one number, the circle's diameter",
    ),
    "key of another kind": (
        REGULAR, REGULAR + "\npeakedness = 2.0",
        8, '[[waves]] peakedness: not a key for kind = "regular"; take it out',
    ),
    "kind without its key": (
        REGULAR, 'kind = "group"\nheight = 0.3\nperiod = 3.5\nfocus = [0.0, 0.0, 9.0]',
        4, '[[waves]] spectrum: missing; kind = "group" needs it',
    ),
    "band upside down": (
        REGULAR, SPECTRUM + "\nband = [4.0, 0.5]",
        8, "[[waves]] band: got [4.0, 0.5], expected the lowest before the highest",
    ),
    "breaking wave": (
        "height = 0.3", "height = 3.0",
        6, "[[waves]] height: got 3, expected less than 2.71 m, where waves of 3.5 s break "
        "(Miche's limit)",
    ),
    "waves in a closed basin": (
        "spacing = 1.5", 'spacing = 1.5\nedges = "wall"',
        4, "[[waves]]: incident waves cannot enter a basin with walls all round; open an edge, or "
        "make the waves with a [[wavemaker]], and take [[waves]] out",
    ),
    "wavemaker on an open edge": (
        "[run]",
        '[[wavemaker]]\nside = "x_min"\nkind = "piston"\nstroke = 0.1\nperiod = 3.0\n[run]',
        18, '[[wavemaker]] side: got "x_min", an edge that absorbs, expected a wall: edges = '
        '{ x_min = "wall" }',
    ),
    "neither mesh nor form": (
        'form = "box"\n', "",
        11, "[[body]]: got neither of mesh and form, expected one of them",
    ),
    "mesh and form": (
        'form = "box"', 'form = "box"\nmesh = "hull.stl"',
        11, "[[body]]: got both of mesh and form, expected one of them",
    ),
    "form without its key": (
        "beam = 4.0\n", "",
        11, '[[body]] beam: missing; form = "box" needs it',
    ),
    "key of another form": (
        "beam = 4.0", "beam = 4.0\nradius = 3.0",
        16, '[[body]] radius: not a key for form = "box"; take it out',
    ),
    "forced without a motion": (
        "beam = 4.0", 'beam = 4.0\nattitude = "forced"',
        11, '[[body]] forced: missing; attitude = "forced" needs it',
    ),
    "body outside the surface": (
        'name = "barge"', 'name = "barge"\nposition = [90.0, 0.0]',
        13, "[[body]] position: got [90.0, 0.0], outside the useful water (-20 <= x <= 20, "
        "-15 <= y <= 15)",
    ),
    "duplicate name": (
        "[[handoff]]", '[[gauge]]\nname = "bow"\nposition = [0.0, 0.0]\n[[handoff]]',
        23, '[[gauge]] "bow" name: got "bow", which is taken, expected each gauge to have its own '
        "name",
    ),
    "name that is no file name": (
        'name = "near"', 'name = "../near"',
        23, '[[handoff]] name: got "../near", expected a name of letters, digits, - and _, 100 '
        "at most (it names files)",
    ),
    "larger than anything": (
        "spacing = 1.5", "spacing = 1e300",
        10, "[surface] spacing: got 1e+300, expected a number above 0, and no number smaller than "
        "1e-12 or larger than 1e+15",
    ),
    "nearly nothing": (
        "height = 0.3", "height = 1e-300",
        6, "[[waves]] height: got 1e-300, expected a number above 0, and no number smaller than "
        "1e-12 or larger than 1e+15",
    ),
    "gauge outside the surface": (
        "position = [8.0, 0.0]", "position = [8.0, 16.0]",
        21, "[[gauge]] position: got [8.0, 16.0], outside the useful water (-20 <= x <= 20, "
        "-15 <= y <= 15)",
    ),
    "box outside the surface": (
        "size = [20.0, 14.0]", "size = [20.0, 14.0], centre = [15.0, 0.0]",
        24, "[[handoff]] box: reaches outside the useful water (-20 <= x <= 20, -15 <= y <= 15); "
        "make the box smaller, or [surface] size larger",
    ),
    "box turned outside the surface": (
        "size = [20.0, 14.0]", "size = [38.0, 14.0], angle = 45.0",
        24, "[[handoff]] box: reaches outside the useful water (-20 <= x <= 20, -15 <= y <= 15); "
        "make the box smaller, or [surface] size larger",
    ),
    "box below the bed": (
        "bottom = -6.0", "bottom = -16.0",
        24, "[[handoff]] box.bottom: got -16, below the bed (z = -10)",
    ),
    "box upside down": (
        "top = 2.0", "top = -7.0",
        24, "[[handoff]] box.top: got -7, expected a level above the bottom (-6)",
    ),
    "missing key of a box": (
        ", top = 2.0", "",
        24, "[[handoff]] box.top: missing; expected a number",
    ),
    "neither box nor points": (
        "box = { size = [20.0, 14.0], bottom = -6.0, top = 2.0 }\n", "",
        22, "[[handoff]]: got neither of box and points, expected one of them",
    ),
    "zone for points": (
        "box = { size = [20.0, 14.0], bottom = -6.0, top = 2.0 }",
        'points = "cells.csv"\nzone = 2.0',
        25, "[[handoff]] zone: not a key for a list of points; take it out",
    ),
    "zone too wide": (
        "every = 0.5", "every = 0.5\nzone = 8.0",
        26, "[[handoff]] zone: got 8, expected at most half the box's lesser side (7)",
    ),
    "interval that does not divide": (
        "every = 0.5", "every = 0.3",
        25, "[[handoff]] every: got 0.3, expected an interval that divides end - start (20) "
        "evenly; the nearest is 0.298507463",
    ),
    "records that do not divide": (
        "duration = 20.0", "duration = 20.0\nrecord_every = 0.7",
        19, "[run] record_every: got 0.7, expected an interval that divides duration (20) evenly; "
        "the nearest is 0.689655172",
    ),
    "hand-off after the end": (
        "every = 0.5", "every = 0.5\nend = 25.0",
        26, "[[handoff]] end: got 25, expected at most the run's duration (20)",
    ),
    "axes of no body": (
        "every = 0.5", 'every = 0.5\naxes = "body:barg"',
        26, '[[handoff]] axes: no body is named "barg"; did you mean "barge"?',
    ),
    "relative on earth": (
        "every = 0.5", 'every = 0.5\nvelocity = "relative"',
        26, '[[handoff]] velocity: got "relative" with axes = "earth", expected axes = "body:..." '
        "with it",
    ),
    "bed in deep water": (
        'form = "box"\nlength = 8.0\nbeam = 4.0\ndraught = 1.0',
        'form = "box"\nlength = 8.0\nbeam = 4.0\ndraught = "bed"',
        16, '[[body]] draught: got "bed", which goes with form = "cylinder" alone, expected a '
        "number",
    ),
    "standing and riding": (
        'form = "box"\nlength = 8.0\nbeam = 4.0\ndraught = 1.0',
        'form = "cylinder"\nradius = 2.0\nattitude = "follow"\ndraught = "bed"',
        16, '[[body]] draught: got "bed", and what rides the surface stands on nothing; expected '
        "a number",
    ),
}  # fmt: skip


@pytest.mark.parametrize("command", ["plan", "run"])
@pytest.mark.parametrize("kind", BAD)
def test_a_bad_case_is_told_in_one_sentence_and_nothing_is_written(
    kind: str, command: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    old, new, line, expected = BAD[kind]
    assert GOOD.count(old) == 1, "the edit must hit one place"
    case = tmp_path / "case.toml"
    case.write_text(GOOD.replace(old, new))

    status = status_of([command, str(case)])

    output = capsys.readouterr()
    where = f"{case} line {line}" if line else str(case)
    assert output.err == f"error: {where}: {expected}\n"
    assert output.out == ""
    assert status == 2
    assert list(tmp_path.iterdir()) == [case]


UNREADABLE = {
    "no such file": (None, "there is no such file; write one with: bemwave new FOLDER"),
    "not UTF-8": (b'title = "\xff"', "byte 9 is not UTF-8, expected a case file"),
    "too large": (b"#" * 10_000_001, "got a file too large, expected a case file"),
    "a mesh": (b"solid hull\n", "line 1: not TOML: Expected '=' after a key"),
    "one line for many": (
        b'[[wavemaker]]\nside = "x_min" ; kind = "piston"\n',
        "line 2: not TOML: Expected newline or end of document after a statement",
    ),
    "key twice": (b"[water]\ndepth = 1\ndepth = 2\n", "line 3: not TOML: Cannot overwrite a value"),
    "nested": (b"title = " + b"[" * 9999 + b"]" * 9999, "nested too deeply for a case file"),
    "broken off": (b'[water]\ntitle = "', "end of document: not TOML: Unterminated string"),
}


@pytest.mark.parametrize("kind", UNREADABLE)
def test_an_unreadable_case_is_told(
    kind: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    content, expected = UNREADABLE[kind]
    case = tmp_path / "case.toml"
    if content is not None:
        case.write_bytes(content)

    assert status_of(["run", str(case)]) == 2

    message = capsys.readouterr().err
    assert message.startswith(f"error: {case}")
    assert expected in message
    assert message.count("\n") == 1
    assert not (tmp_path / "case-run").exists()


def test_a_folder_is_no_case(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert status_of(["plan", str(tmp_path)]) == 2
    expected = f"got a folder, expected a case file; try {tmp_path / 'case.toml'}"
    assert capsys.readouterr().err == f"error: {tmp_path}: {expected}\n"


def test_all_faults_are_told_at_once_in_the_order_of_the_file(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    case = tmp_path / "case.toml"
    case.write_text(GOOD.replace("depth = 10.0", "depth = 0").replace("beam = 4.0", "beam = -4.0"))
    assert status_of(["plan", str(case)]) == 2
    message = capsys.readouterr().err
    assert message == (
        f"error: {case} line 3: [water] depth: got 0, expected a number above 0 in metres, or "
        f'"deep"\n{case} line 15: [[body]] beam: got -4.0, expected a number above 0\n'
    )
