"""Hulls from case bodies, the inspection of a file, and the meshes that come with the project."""

import importlib.util
import math
from pathlib import Path

import numpy as np
import pytest

from bemwave.case.body import Body
from bemwave.errors import InputError
from bemwave.geometry.bodies import default_fine_spacing, hull_from
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.faults import find_faults
from bemwave.geometry.files import read_mesh, write_mesh
from bemwave.geometry.forms import box, sphere
from bemwave.geometry.inspection import inspect_hull
from bemwave.geometry.remesh import edge_lengths, quality
from bemwave.geometry.topology import boundary_loops
from bemwave.geometry.water_surface import fitted_water

MESHES = Path(__file__).parents[2] / "meshes"


def hull(spacing=2.0, depth=10.0, folder=MESHES, **keys):
    return hull_from(Body(name="a", **keys), spacing=spacing, depth=depth, folder=folder)


def script(name):
    spec = importlib.util.spec_from_file_location(name, MESHES / f"{name}.py")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


# from the case


@pytest.mark.parametrize(
    ("keys", "volume"),
    [
        ({"form": "box", "length": 4.0, "beam": 2.0, "draught": 1.0}, 8.0),
        ({"form": "cylinder", "radius": 1.0, "draught": 2.0}, 2 * math.pi),
        ({"form": "cylinder", "radius": 1.0, "draught": "bed"}, 10 * math.pi),
        ({"form": "cylinder", "radius": 1.0, "draught": 14.0}, 10 * math.pi),
        ({"form": "sphere", "radius": 1.0}, 2 / 3 * math.pi),
        ({"form": "sphere", "radius": 1.0, "centre_depth": 3.0}, 4 / 3 * math.pi),
    ],
)
def test_forms_of_the_case(keys, volume):
    made = hull(position=(3.0, 4.0), heading=90.0, **keys)
    assert made.hydrostatics.volume == pytest.approx(volume, rel=1e-9)
    assert made.place(made.hydrostatics.centre_of_buoyancy)[:2] == pytest.approx([3.0, 4.0])
    assert made.heading == pytest.approx(math.pi / 2)
    assert made.mesh.part_names == ("a",)


def test_wigley_of_the_case_lies_along_its_heading():
    made = hull(form="wigley", length=10.0, beam=1.0, draught=0.6, heading=90.0, panel_size=0.25)
    size = np.ptp(made.mesh.points, axis=0)
    assert size == pytest.approx([1.0, 10.0, 0.6], rel=1e-9)
    assert made.hydrostatics.length == pytest.approx(10.0)


@pytest.mark.parametrize(("spacing", "size"), [(0.4, 0.2), (4.0, 1 / 3)])
def test_default_panel_size(spacing, size):
    # half the spacing, or a sixth of the least width
    made = hull(spacing, form="box", length=8.0, beam=2.0, draught=1.0)
    sides = edge_lengths(made.mesh)
    assert np.median(np.sort(sides, axis=1)[:, :2]) == pytest.approx(size, rel=0.1)


def test_default_fine_spacing_goes_by_the_thinnest_waterline():
    ship = hull(form="wigley", length=12.0, beam=3.0, draught=1.0, heading=30.0)
    pile = hull(form="cylinder", radius=1.0, draught="bed")
    ball = hull(form="sphere", radius=0.1, centre_depth=3.0)
    assert default_fine_spacing(4.0, [ship]) == pytest.approx(0.5, rel=1e-6)
    assert default_fine_spacing(4.0, [ship, pile]) == pytest.approx(1 / 3, rel=0.03)
    assert default_fine_spacing(0.5, [ship, pile, ball]) == 0.25
    assert default_fine_spacing(4.0, [ball]) == 4.0


def test_bed_in_deep_water_is_refused():
    with pytest.raises(InputError, match='draught = "bed" in water of depth "deep"'):
        hull(depth=math.inf, form="cylinder", radius=1.0, draught="bed")


def test_a_file_s_units_and_up_axis_are_doubted_until_stated(tmp_path):
    mesh = sphere(1.0, 0.0, 0.2).flipped()
    write_mesh(mesh.with_points(1000 * mesh.points), tmp_path / "large.stl")
    with pytest.raises(InputError, match=r"large.stl: it measures 2006\.44 x .* scale = 0.001"):
        hull(folder=tmp_path, mesh="large.stl")
    stated = hull(
        math.inf, math.inf, folder=tmp_path, mesh="large.stl", scale=1.0, panel_size=200.0
    )
    assert stated.hydrostatics.length > 1000
    with pytest.raises(InputError, match="no such mesh file"):
        hull(folder=tmp_path, mesh="small.stl")


# inspection


def test_inspection_of_a_sound_hull():
    seen = inspect_hull(MESHES / "tender.stl", draught=1.9)
    assert seen.faults == ()
    rows = {label: (value, unit) for label, value, unit in seen.rows()}
    assert rows["draught"] == ("1.9", "m")
    assert rows["displaced volume"][1] == "m3"
    assert rows["waterplane area"][1] == "m2"
    assert rows["length"][1] == rows["beam"][1] == rows["centre of buoyancy"][1] == "m"
    assert float(rows["displaced volume"][0]) == pytest.approx(seen.hydrostatics.volume, rel=1e-5)
    assert seen.parts == {"piece1": len(seen.mesh.triangles)}


def test_inspection_lists_what_is_wrong(tmp_path):
    mesh = box(4, 2, 1, 0.5).flipped()
    wrong = mesh.with_points(1000 * (mesh.points + np.array([0, 0, 3.0])))
    wrong = wrong.keep(np.arange(len(wrong.triangles)) > 0)
    write_mesh(wrong, tmp_path / "wrong.obj")
    seen = inspect_hull(tmp_path / "wrong.obj")
    assert {fault.kind for fault in seen.faults} == {"size", "hole", "above water"}
    assert seen.hydrostatics is None
    assert [label for label, _, _ in seen.rows()][-1] == "extent z"
    with pytest.raises(InputError):
        inspect_hull(tmp_path / "wrong.obj", cut=True)


def test_cut_mesh_has_the_waterline_at_zero_and_reads_back(tmp_path):
    seen = inspect_hull(MESHES / "tender.stl", draught=1.9, cut=True)
    write_mesh(seen.mesh, tmp_path / "cut.vtu")
    again = inspect_hull(tmp_path / "cut.vtu", cut=True)
    assert again.mesh.points[:, 2].max() == 0.0
    assert again.hydrostatics.volume == pytest.approx(seen.hydrostatics.volume, rel=1e-12)
    assert find_faults(again.mesh, open_at=[0.0]) == []


def test_remeshed_mesh_is_inspected_after_and_before(needs_gmsh):
    seen = inspect_hull(MESHES / "tender.stl", draught=1.9, panel_size=0.8)
    assert seen.hydrostatics.volume < seen.hydrostatics_before.volume
    assert seen.hydrostatics.volume == pytest.approx(seen.hydrostatics_before.volume, rel=0.02)
    assert quality(seen.mesh).min() > 0.3


# the meshes that come with the project


def test_the_tender_is_what_her_script_makes_and_what_it_says():
    path = MESHES / "tender.stl"
    assert path.stat().st_size < 200_000
    maker = script("make_tender")
    np.testing.assert_array_equal(
        read_mesh(path).vertices, maker.tender().vertices.astype(np.float32)
    )
    whole = read_mesh(path)
    assert find_faults(whole) == []  # closed, deck and transom included
    assert np.abs(whole.points[:, 2]).min() == 0.0  # z = 0 is the keel
    data = inspect_hull(path, draught=maker.DRAUGHT).hydrostatics
    # the figures her script states
    assert data.volume == pytest.approx(185.4, abs=0.1)
    assert 1.025 * data.volume == pytest.approx(190.0, abs=0.1)
    assert (data.length, data.beam) == pytest.approx((23.6, 7.8), abs=0.05)
    assert data.volume / (data.length * data.beam * 1.9) == pytest.approx(0.53, abs=0.005)
    assert data.centre_of_buoyancy[0] == pytest.approx(-1.05, abs=0.01)
    assert data.centre_of_buoyancy[1] == pytest.approx(0.0, abs=1e-6)


@pytest.fixture
def demo(monkeypatch):
    """The demonstration's ready meshes in their places; the mesher must not be called."""

    def no_mesher(*args, **kwargs):
        raise AssertionError("the mesher was called")

    monkeypatch.setattr("bemwave.geometry.remesh.run_job", no_mesher)
    maker = script("make_demo_meshes")
    bodies = [
        Body(
            name="tender",
            mesh="tender-wetted.vtu",
            panel_size=maker.TENDER_PANEL,
            position=maker.TENDER_POSITION,
            heading=maker.TENDER_HEADING,
        ),
        Body(
            name="platform",
            mesh="platform.vtu",
            panel_size=maker.PLATFORM_PANEL,
            position=maker.PLATFORM_POSITION,
            heading=maker.PLATFORM_HEADING,
        ),
    ]
    return maker, [
        hull_from(body, spacing=maker.SPACING, depth=40.0, folder=MESHES) for body in bodies
    ]


def test_the_ready_meshes_fit_together(demo):
    maker, (tender, platform) = demo
    polygons = [*tender.polygons(), *platform.polygons()]
    water = fitted_water(read_mesh(MESHES / "water.vtu"), polygons, "water.vtu")
    mesh = boundary_mesh(water, [tender, platform])
    assert len(mesh.triangles) <= 6000
    assert quality(mesh).min() > 0.3
    assert len(boundary_loops(mesh.triangles)) == 1  # the rim alone is open
    size = np.array(maker.SIZE) + 2 * maker.ABSORBER
    assert np.ptp(water.points, axis=0)[:2] == pytest.approx(size)


def test_the_ready_hulls_keep_their_figures(demo):
    maker, (tender, platform) = demo
    whole = inspect_hull(MESHES / "tender.stl", draught=maker.TENDER_DRAUGHT).hydrostatics
    assert tender.hydrostatics.volume == pytest.approx(whole.volume, rel=0.03)  # chords
    assert tender.hydrostatics.waterplane_area == pytest.approx(whole.waterplane_area, rel=0.01)
    assert platform.hydrostatics.draught == pytest.approx(maker.PLATFORM["draught"])
    assert platform.hydrostatics.waterplane_area == pytest.approx(16 * math.pi)
    assert len(platform.waterlines) == 4
