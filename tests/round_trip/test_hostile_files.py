"""Files from strangers are read right or refused with a sentence, and never do anything else."""

from __future__ import annotations

import subprocess
import sys
import zlib
from base64 import b64encode
from pathlib import Path

import numpy as np
import pytest

from bemwave.case import read_case
from bemwave.errors import InputError
from bemwave.geometry.files import read_mesh
from bemwave.handoff.point_list import load_points


def try_mutations(count: int, seed: int, home: Path) -> None:
    command = [sys.executable, "-m", "tests.round_trip.hostile_meshes", str(count), str(seed)]
    root = Path(__file__).parents[2]
    done = subprocess.run([*command, str(home)], cwd=root, capture_output=True, text=True)
    assert done.returncode == 0, done.stdout + done.stderr


def test_mutated_meshes_are_read_or_refused(tmp_path: Path) -> None:
    try_mutations(96, 1, tmp_path)


@pytest.mark.slow
def test_a_thousand_mutated_meshes_are_read_or_refused(tmp_path: Path) -> None:
    try_mutations(1008, 2, tmp_path)


BOMB = """<?xml version="1.0"?>
<!DOCTYPE x [<!ENTITY a "aaaaaaaaaaaaaaaaaaaa"> <!ENTITY b "&a;&a;&a;&a;&a;&a;&a;&a;&a;">]>
<VTKFile type="{kind}" version="0.1"><Piece>&b;</Piece></VTKFile>
"""


@pytest.mark.parametrize(("ending", "kind"), [("vtu", "UnstructuredGrid"), ("vtp", "PolyData")])
def test_xml_entities_are_refused_before_they_unfold(
    ending: str, kind: str, tmp_path: Path
) -> None:
    path = tmp_path / f"bomb.{ending}"
    for text in (BOMB, BOMB.replace('"aaaaaaaaaaaaaaaaaaaa"', 'SYSTEM "file:///etc/passwd"')):
        path.write_text(text.format(kind=kind))
        for read in (read_mesh, load_points):
            with pytest.raises(InputError, match="defines XML entities"):
                read(path)


@pytest.mark.parametrize("ending", ["vtu", "vtp"])
def test_a_file_that_announces_too_much_is_refused(ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"absurd.{ending}"
    path.write_text('<VTKFile><Piece NumberOfPoints="99999999999" NumberOfCells="1"/></VTKFile>')
    with pytest.raises(InputError, match=r"announces NumberOfPoints = 99999999999 in \d+ bytes"):
        read_mesh(path)


def test_data_that_unfolds_without_end_is_refused(tmp_path: Path) -> None:
    block = zlib.compress(bytes(62_500_000), 9)
    many = 24  # blocks, 1.5 GB in all
    head = np.array([many, 62_500_000, 0, *[len(block)] * many], dtype="<u4").tobytes()
    data = (b64encode(head) + b64encode(block * many)).decode()
    path = tmp_path / "bomb.vtu"
    path.write_text(
        '<?xml version="1.0"?><VTKFile type="UnstructuredGrid" version="0.1" '
        'byte_order="LittleEndian" header_type="UInt32" compressor="vtkZLibDataCompressor">'
        '<UnstructuredGrid><Piece NumberOfPoints="3" NumberOfCells="1"><Points><DataArray '
        f'type="Float64" NumberOfComponents="3" format="binary">{data}</DataArray></Points>'
        "</Piece></UnstructuredGrid></VTKFile>"
    )
    with pytest.raises(InputError, match=r"bomb\.vtu cannot be read as \.vtu"):
        read_mesh(path)


CASE = """\
[water]
depth = 10.0
[surface]
size = [40.0, 20.0]
spacing = 2.0
[run]
duration = 10.0
[[{table}]]
name = "{name}"
{rest}
"""
TABLES = {
    "body": 'form = "sphere"\nradius = 1.0',
    "gauge": "position = [0.0, 0.0]",
    "handoff": "box = { size = [4.0, 4.0], bottom = -1.0, top = 1.0 }",
}


@pytest.mark.parametrize("table", TABLES)
@pytest.mark.parametrize("name", ["../up", "/etc/x", "a/b", "..", "", "a\\u0000b", "a\\n", "C:x"])
def test_names_that_become_file_names_cannot_lead_elsewhere(
    table: str, name: str, tmp_path: Path
) -> None:
    (tmp_path / "case.toml").write_text(CASE.format(table=table, name=name, rest=TABLES[table]))
    with pytest.raises(InputError, match=r"expected a name of letters, digits, - and _"):
        read_case(tmp_path / "case.toml")


def test_nothing_unpickles_or_evaluates() -> None:
    root = Path(__file__).parents[2] / "bemwave"
    for path in root.rglob("*.py"):
        text = path.read_text(encoding="utf-8")
        for word in ("import pickle", "allow_pickle=True", "eval(", "exec(", "os.system", "shell="):
            assert word not in text, (path, word)
