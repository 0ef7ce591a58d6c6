"""What README says stays true: its commands, its case, its links; CI runs its test command."""

from __future__ import annotations

import os
import re
from pathlib import Path

import pytest

from bemwave import cli
from bemwave.case import read_case, refuse_not_yet

ROOT = Path(cli.__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def blocks(language: str) -> list[str]:
    return re.findall(rf"```{language}\n(.*?)```", README, re.DOTALL)


def test_ci_runs_the_second_command() -> None:
    second = blocks("sh")[1].strip()
    assert "\n" not in second
    assert second in (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert os.access(ROOT / ".ci" / "run", os.X_OK)


def test_ci_installs_the_libraries_that_readme_names() -> None:
    named = blocks("sh")[2].split("--no-install-recommends ")[1].split()
    listed = re.search(r"libraries=\((.*?)\)", (ROOT / ".ci" / "run").read_text(encoding="utf-8"))
    assert listed is not None
    assert named == listed[1].split()


def test_the_first_command_runs_a_case_that_is_there() -> None:
    first = blocks("sh")[0].strip()
    assert "\n" not in first
    case = read_case(ROOT / first.split()[-1])
    refuse_not_yet(case)


def test_the_case_is_sound(tmp_path: Path) -> None:
    file = tmp_path / "case.toml"
    file.write_text(blocks("toml")[0], encoding="utf-8")
    case = read_case(file)
    refuse_not_yet(case)
    assert case.body[0].draught == 1.9


@pytest.mark.parametrize("command", sorted(set(re.findall(r"`bemwave ([a-z]+)", README))))
def test_every_command_named_exists(command: str) -> None:
    assert command in cli.commands.commands


def test_every_file_linked_is_there() -> None:
    for name in re.findall(r"\]\(([^)#:]+)\)", README):
        assert (ROOT / name).exists(), name
