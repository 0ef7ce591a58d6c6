"""Every mesh format back as it went out, part names where the format holds them; bad files."""

import os
import struct
import sys

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from bemwave.errors import InputError
from bemwave.geometry.files import FORMATS, read_mesh, write_mesh
from bemwave.geometry.forms import box, wigley
from bemwave.geometry.surface_mesh import SurfaceMesh, joined

HOLDS_NAMES = {".obj", ".vtu", ".msh", ".vtp", ".stl text"}
CASES = [*FORMATS, ".stl text"]


def two_parts():
    """Awkward numbers, interleaved parts, names with blanks and signs."""
    mesh = joined([wigley(10, 1, 0.7, 0.6), box(3, 1, 1, 0.5).renamed("fender, port|upper 1")])
    part = np.arange(len(mesh.triangles)) % 2
    return SurfaceMesh(mesh.points * np.pi, mesh.triangles[::-1], part, mesh.part_names)


def there_and_back(mesh, folder, case):
    path = folder / f"mesh{case.split()[0]}"
    write_mesh(mesh, path, text=case.endswith("text"))
    return read_mesh(path)


@pytest.mark.parametrize("case", CASES)
def test_round_trip(case, tmp_path):
    mesh = two_parts()
    back = there_and_back(mesh, tmp_path, case)
    # corner by corner, so winding and order are checked too
    exact = mesh.vertices.astype(np.float32) if case == ".stl" else mesh.vertices
    np.testing.assert_array_equal(back.vertices, exact)
    if case in HOLDS_NAMES:
        names = [mesh.part_names[k] for k in mesh.part]
        assert [back.part_names[k] for k in back.part] == names
    else:
        assert back.part_names == ("unnamed",)
    assert os.listdir(tmp_path) == [f"mesh{case.split()[0]}"]  # no side files


@pytest.mark.parametrize("case", sorted(set(CASES) - {".stl", ".stl text"}))
def test_points_keep_their_numbers(case, tmp_path):
    mesh = two_parts()
    back = there_and_back(mesh, tmp_path, case)
    np.testing.assert_array_equal(back.points, mesh.points)
    np.testing.assert_array_equal(back.triangles, mesh.triangles)


@pytest.mark.parametrize("case", [".stl", ".stl text"])
def test_equal_corners_of_an_stl_become_one_point(case, tmp_path):
    mesh = box(2, 1, 1, 0.5)
    back = there_and_back(mesh, tmp_path, case)
    assert len(back.points) == len(mesh.points)


coordinate = st.floats(-1e6, 1e6, allow_subnormal=False)


@settings(deadline=None, max_examples=25)
@given(
    points=st.lists(st.tuples(coordinate, coordinate, coordinate), min_size=3, max_size=12),
    case=st.sampled_from(sorted(set(CASES) - {".stl"})),
    data=st.data(),
)
def test_any_triangles_survive(tmp_path_factory, points, case, data):
    corner = st.integers(0, len(points) - 1)
    triangles = data.draw(st.lists(st.tuples(corner, corner, corner), min_size=1, max_size=10))
    mesh = SurfaceMesh.of_one_part(points, triangles, "hull")
    back = there_and_back(mesh, tmp_path_factory.mktemp("any"), case)
    np.testing.assert_array_equal(back.vertices, mesh.vertices)


def test_quads_and_polygons_are_split(tmp_path):
    path = tmp_path / "quads.obj"
    path.write_text(
        "v 0 0 0\nv 2 0 0\nv 2 1 0\nv 0 1 0\nv 1 2 0\n"
        "o roof\nf 4 3 5\ng house\nf 1 2 3 4\nf 1 2 3 5 4\n"
    )
    mesh = read_mesh(path)
    assert mesh.part_names == ("roof", "house")
    assert mesh.part.tolist() == [0, 1, 1, 1, 1, 1]
    assert mesh.areas[0] == 1.0
    assert mesh.areas[1:3].sum() == 2.0
    assert mesh.areas[3:].sum() == 3.0
    assert np.all(mesh.normals[:, 2] == 1.0)


def test_text_stl_as_other_programs_write_it(tmp_path):
    path = tmp_path / "shouting.stl"
    path.write_text(
        "\nSOLID hull  \n  FACET NORMAL 0 0 1\n OUTER LOOP\n"
        "  VERTEX 0 0 0\n VERTEX 1 0 0\n\n VERTEX 0 1 0\n ENDLOOP\n ENDFACET\nENDSOLID hull\n"
        "solid\nfacet normal 0 0 1\nouter loop\nvertex 1 0 0\nvertex 1 1 0\nvertex 0 1 0\n"
        "endloop\nendfacet\nendsolid\n"
    )
    mesh = read_mesh(path)
    assert (len(mesh.points), mesh.part_names) == (4, ("hull", "unnamed"))


def test_binary_stl_that_says_solid_is_binary(tmp_path):
    path = tmp_path / "solid.stl"
    write_mesh(box(2, 1, 1, 0.5), path)
    content = path.read_bytes()
    path.write_bytes(b"solid".ljust(80) + content[80:])
    assert len(read_mesh(path).triangles) == len(box(2, 1, 1, 0.5).triangles)


# bad files


def binary_stl(count, records):
    triangle = struct.pack("<12fH", 0, 0, 1, 0, 0, 0, 1, 0, 0, 0, 1, 0, 0)
    return b"made by hand".ljust(80) + struct.pack("<I", count) + triangle * records


def ply(vertices, faces):
    return (
        f"ply\nformat binary_little_endian 1.0\nelement vertex {vertices}\nproperty float x\n"
        f"property float y\nproperty float z\nelement face {faces}\n"
        "property list uint8 int32 vertex_indices\nend_header\n"
    ).encode() + bytes(40)


TEXT_STL = "solid a\nfacet normal 0 0 1\nouter loop\nvertex 0 0 0\nvertex 1 0 0\nvertex 0 1 0\n"

BAD = {
    "empty.stl": (b"", "is empty"),
    "cut.stl": (binary_stl(7, 6), "announces 7 triangles, 434 bytes: it is cut off"),
    "absurd.stl": (binary_stl(4_000_000_000, 2), "announces 4000000000 triangles"),
    "none.stl": (binary_stl(0, 0), "no triangles"),
    "short.stl": (b"\x00" * 40, "cut off or damaged"),
    "cut-text.stl": (TEXT_STL.encode(), "breaks off after 0 triangles"),
    "words.stl": (TEXT_STL.replace("1 0 0", "one 0 0").encode(), "cannot be read as .stl"),
    "nan.stl": (
        (TEXT_STL.replace("1 0 0", "nan 0 0") + "endloop\nendfacet\nendsolid\n").encode(),
        "not finite",
    ),
    "points.obj": (b"v 0 0 0\nv 1 0 0\nv 0 1 0\n", "no triangles"),
    "outside.obj": (b"v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1 2 9\n", "cannot be read as .obj"),
    "nonsense.obj": (b"\xff\xfe\x00nonsense", "cannot be read|no triangles"),
    "huge.ply": (ply(3, 4_000_000_000), "announces 4000000000 elements"),
    "cut.ply": (ply(30, 10), "cannot be read as .ply"),
    "nonsense.ply": (b"nonsense", "has no line 'end_header'"),
    "nonsense.vtu": (b"<VTKFile><no", "cannot be read as .vtu"),
    "nonsense.vtp": (b"<VTKFile><no", "cannot be read|no triangles"),
    "nonsense.msh": (b"$MeshFormat\n9.9 0 8\n", "cannot be read as .msh"),
    "cut.msh": (b"$MeshFormat\n2.2 0 8\n$EndMeshFormat\n$Nodes\n3\n1 0 0 0\n", "cannot be read"),
    "mesh.step": (b"ISO-10303-21;", "meshes ending in '.step' are not known; use one of .stl"),
    "mesh": (b"", "ending in 'nothing'"),
}


@pytest.mark.parametrize("name", BAD)
def test_bad_files_get_one_sentence(name, tmp_path, capfd):
    content, says = BAD[name]
    path = tmp_path / name
    path.write_bytes(content)
    with pytest.raises(InputError, match=says) as caught:
        read_mesh(path)
    assert "\n" not in str(caught.value)
    assert name in str(caught.value)
    assert capfd.readouterr() == ("", "")  # the libraries print nothing


def test_volume_meshes_are_refused(tmp_path):
    import meshio

    path = tmp_path / "solid.vtu"
    meshio.Mesh([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1.0]], {"tetra": [[0, 1, 2, 3]]}).write(
        path
    )
    with pytest.raises(InputError, match="tetra cells; a surface"):
        read_mesh(path)


def test_a_missing_file_and_an_unwritable_place(tmp_path):
    with pytest.raises(InputError, match="no such mesh file"):
        read_mesh(tmp_path / "hull.stl")
    for case in FORMATS:
        with pytest.raises(InputError, match="cannot be written"):
            write_mesh(box(2, 1, 1, 0.5), tmp_path / "nowhere" / f"mesh{case}")
    with pytest.raises(InputError, match="not known"):
        write_mesh(box(2, 1, 1, 0.5), tmp_path / "mesh.xyz")


def test_nothing_that_a_library_raises_gets_out(tmp_path, monkeypatch):
    path = tmp_path / "a.vtu"
    write_mesh(box(2, 1, 1, 0.5), path)

    def leave(*args):
        print("noise")
        sys.exit(1)

    monkeypatch.setattr("meshio.vtu.read", leave)
    with pytest.raises(InputError, match=r"cannot be read as .vtu \(1\)"):
        read_mesh(path)


def test_msh_version_4_groups(tmp_path, needs_gmsh):
    # a file as gmsh itself writes it, in a process of its own
    import subprocess

    path = tmp_path / "g.msh"
    script = (
        "import gmsh; gmsh.initialize(interruptible=False); gmsh.option.setNumber("
        "'General.Terminal', 0); b = gmsh.model.occ.addBox(0, 0, 0, 1, 1, 1);"
        "gmsh.model.occ.synchronize(); gmsh.model.addPhysicalGroup(2, [1, 2], name='ends');"
        "gmsh.model.addPhysicalGroup(2, [3, 4, 5, 6], name='sides');"
        f"gmsh.model.mesh.generate(2); gmsh.write({str(path)!r})"
    )
    subprocess.run([sys.executable, "-c", script], check=True)
    mesh = read_mesh(path)
    assert sorted(mesh.part_names) == ["ends", "sides"]
    assert mesh.areas[mesh.in_part("ends")].sum() == pytest.approx(2.0)
    assert mesh.areas.sum() == pytest.approx(6.0)
