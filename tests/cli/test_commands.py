"""The commands as typed: help, wrong use, what comes later, exit codes."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import click
import pytest

from bemwave import cli, errors
from bemwave.case import read_case, refuse_not_yet
from bemwave.cli import status_of
from bemwave.records import default_folder

COMMANDS = [
    "new", "mesh", "plan", "run", "sample", "check", "response", "compare", "report", "sweep",
]  # fmt: skip


def bemwave(*arguments: str, cwd: Path | None = None) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-c", "from bemwave.cli import main; main()", *arguments]
    environment = {"PYTHONPATH": str(Path(cli.__file__).parents[1]), "PATH": ""}
    return subprocess.run(
        command, capture_output=True, text=True, cwd=cwd, env=environment, timeout=60, check=False
    )


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_explains_itself(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert status_of([command, "--help"]) == 0
    assert capsys.readouterr().out.startswith(f"Usage: bemwave {command}")


def test_without_a_command_the_commands_are_listed(capsys: pytest.CaptureFixture[str]) -> None:
    assert status_of([]) == 0
    listed = capsys.readouterr().out
    assert all(f"\n  {command} " in listed for command in COMMANDS)


@pytest.mark.parametrize(
    ("arguments", "expected"),
    [
        (["run"], "Missing argument 'CASE'; see bemwave run --help"),
        (["rum", "x"], "No such command 'rum'"),
        (["run", "case.toml", "--foo"], "No such option '--foo'"),
        (["mesh", "hull.stl", "--scale", "big"], "'big' is not a valid float"),
        (["mesh", "hull.stl", "--panel-size", "0"], "got 0, expected a number above 0"),
        (["mesh", "hull.stl", "--draught", "nan"], "got nan, expected a number above 0"),
        (["mesh", "hull.stl", "--up", "w"], "'w' is not one of 'x', 'y', 'z'"),
        (["report", "a-run", "--times", "5;9"], "got 5;9, expected seconds such as 10,20"),
    ],
)
def test_wrong_use_is_an_error(
    arguments: list[str], expected: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert status_of(arguments) == 2
    output = capsys.readouterr()
    assert output.err.startswith("error: ")
    assert expected in output.err
    assert output.out == ""


@pytest.mark.parametrize(
    "arguments",
    [
        ["sample", "RUN", "--points", "cells.csv", "--out", "new.nc"],
        ["response", "case.toml", "--periods", "4:20:0.5", "--headings", "0:180:30"],
        ["compare", "RUN", "--gauges", "gauges.csv"],
        ["sweep", "case.toml", "--set", "waves.0.height=1,2"],
        ["run", "case.toml", "--couple", "precice.xml"],
    ],
)
def test_what_comes_later_says_so(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    assert status_of(arguments) == 2
    assert capsys.readouterr().err.startswith("error: not yet: ")


@pytest.mark.parametrize(
    ("raised", "status", "message"),
    [
        (errors.InputError("a sentence"), 2, "a sentence"),
        (errors.RunError("a sentence"), 3, "a sentence"),
        (KeyboardInterrupt(), 130, "interrupted"),
        (PermissionError(13, "Permission denied", "x.nc"), 2, "x.nc: Permission denied"),
        (MemoryError(), 3, "the machine has no memory left"),
    ],
)
def test_errors_end_as_exit_codes(
    raised: BaseException,
    status: int,
    message: str,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    @click.command()
    def failing() -> None:
        raise raised

    monkeypatch.setitem(cli.commands.commands, "failing", failing)
    assert status_of(["failing"]) == status
    assert capsys.readouterr().err.startswith(f"error: {message}")


def test_new_writes_a_case_that_this_version_can_do(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = tmp_path / "first"
    assert status_of(["new", str(folder)]) == 0
    assert [entry.name for entry in folder.iterdir()] == ["case.toml"]
    assert str(folder / "case.toml") in capsys.readouterr().out
    case = read_case(folder / "case.toml")
    refuse_not_yet(case)
    assert case.body[0].name == "barge"
    assert case.handoff[0].box is not None


def test_new_keeps_what_is_there(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "mine.txt").write_text("mine")
    assert status_of(["new", str(tmp_path)]) == 2
    assert "not empty" in capsys.readouterr().err
    assert status_of(["new", str(tmp_path / "mine.txt")]) == 2
    assert "got a file" in capsys.readouterr().err
    assert [entry.name for entry in tmp_path.iterdir()] == ["mine.txt"]


def test_new_fills_an_empty_folder(tmp_path: Path) -> None:
    assert status_of(["new", str(tmp_path)]) == 0
    assert (tmp_path / "case.toml").is_file()


def test_the_default_run_folder_is_beside_the_case() -> None:
    assert default_folder(Path("a/storm.toml")) == Path("a/storm-run")


def test_the_program_itself_returns_the_code_without_a_traceback(tmp_path: Path) -> None:
    done = bemwave("run", "nothing.toml", cwd=tmp_path)
    assert done.returncode == 2
    assert done.stderr.startswith("error: nothing.toml: there is no such file")
    assert "Traceback" not in done.stderr
    assert list(tmp_path.iterdir()) == []


def test_help_loads_nothing_heavy(tmp_path: Path) -> None:
    code = (
        "import sys; from bemwave.cli import status_of; status_of(['run', '--help']); "
        "heavy = {'numpy', 'scipy', 'numba', 'pydantic', 'rich', 'netCDF4'} & set(sys.modules); "
        "sys.exit(str(heavy) if heavy else 0)"
    )
    environment = {"PYTHONPATH": str(Path(cli.__file__).parents[1])}
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, env=environment, check=False
    )
    assert done.returncode == 0, done.stderr
