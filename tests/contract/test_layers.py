"""One direction of flow: nothing imports what stands to its right, or beside it."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

import bemwave

PACKAGE = Path(bemwave.__file__).parent
LAYERS = [
    {"errors"},
    {"case", "waves", "kernels"},
    {"geometry"},
    {"flow"},
    {"bodies"},
    {"stepping"},
    {"handoff", "frames"},
    {"records"},
    {"checks"},
    {"running"},
    {"report"},
    {"cli"},
]
RANK = {part: rank for rank, layer in enumerate(LAYERS) for part in layer}
FILES = sorted(PACKAGE.rglob("*.py"))


def imports_of(file: Path) -> list[tuple[int, str]]:
    """Line and dotted name of every import of a file, those inside functions too."""
    package = ("bemwave", *file.relative_to(PACKAGE).parent.parts)
    return list(imports_in(file.read_text(encoding="utf-8"), package))


def imports_in(text: str, package: tuple[str, ...]) -> Iterator[tuple[int, str]]:
    for node in ast.walk(ast.parse(text)):
        if isinstance(node, ast.Import):
            yield from ((node.lineno, alias.name) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) + 1 - node.level] if node.level else ()
            start = ".".join([*base, *([node.module] if node.module else [])])
            yield from ((node.lineno, f"{start}.{alias.name}") for alias in node.names)


def part_of(file: Path) -> str:
    return file.relative_to(PACKAGE).with_suffix("").parts[0]


def test_every_part_of_the_package_has_its_layer() -> None:
    parts = {part_of(file) for file in FILES} - {"__init__"}
    assert parts <= set(RANK)


@pytest.mark.parametrize("file", FILES, ids=lambda file: str(file.relative_to(PACKAGE)))
def test_imports_flow_one_way(file: Path) -> None:
    part = part_of(file)
    if part == "__init__":
        return  # the public names, imported when first used
    for line, name in imports_of(file):
        words = name.split(".")
        if words[0] != "bemwave" or len(words) == 1:
            continue
        other = words[1]
        if other not in RANK:
            assert other in ("__version__",), f"{file} line {line} goes through the public names"
            continue
        assert other == part or RANK[other] < RANK[part], (
            f"{file} line {line}: {part} imports {other}, which is not to its left"
        )


def test_kernels_import_nothing_of_the_package_but_themselves() -> None:
    for file in (PACKAGE / "kernels").glob("*.py"):
        for line, name in imports_of(file):
            words = name.split(".")
            assert words[0] != "bemwave" or words[1] == "kernels", f"{file} line {line}"


def test_only_geometry_uses_the_mesher() -> None:
    for file in FILES:
        meshers = {name.split(".")[0] for _, name in imports_of(file)} & {"gmsh", "pygmsh"}
        assert not meshers or part_of(file) == "geometry", f"{file} imports {meshers}"


def test_the_reader_of_imports_sees_each_form() -> None:
    text = (
        "import bemwave.waves\nfrom bemwave import case\nfrom . import state\n"
        "def late():\n    from ..geometry.hull import Hull\n"
    )
    assert list(imports_in(text, ("bemwave", "flow"))) == [
        (1, "bemwave.waves"),
        (2, "bemwave.case"),
        (3, "bemwave.flow.state"),
        (5, "bemwave.geometry.hull.Hull"),
    ]
