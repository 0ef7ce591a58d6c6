"""From a hull file to a placed, wetted hull: cutting, faults, attitude, remeshing."""

import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from bemwave.errors import InputError
from bemwave.geometry.cut import above, below
from bemwave.geometry.faults import find_faults
from bemwave.geometry.files import read_mesh
from bemwave.geometry.forms import box, cylinder, sphere
from bemwave.geometry.hull import prepare_hull
from bemwave.geometry.hull_file import put_in_water, width_under_water
from bemwave.geometry.hydrostatics import hydrostatics
from bemwave.geometry.intersections import piercing_edges
from bemwave.geometry.remesh import quality
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import boundary_loops, weld


def closed_box(length=6.0, beam=2.0, height=3.0, size=0.5):
    """A box round the origin, closed, normals out of it."""
    lower = box(length, beam, 0.5 * height, size)
    upper = lower.with_points(lower.points * [1, 1, -1]).flipped()
    return weld(joined([lower, upper]), 1e-9)[0].flipped()


def ball(radius=1.0, size=0.15):
    """A whole sphere round the origin, normals out of it."""
    mesh = sphere(radius, 2.0, size).flipped()
    return mesh.with_points(mesh.points + np.array([0, 0, 2.0]))


def moved(mesh, shift):
    return mesh.with_points(mesh.points + np.asarray(shift))


def turned(mesh, angle):
    c, s = math.cos(angle), math.sin(angle)
    return mesh.with_points(mesh.points @ np.array([[c, -s, 0], [s, c, 0], [0, 0, 1]]).T)


# the cut


@settings(deadline=None, max_examples=60)
@given(level=st.floats(-0.98, 0.98), tilt=st.floats(0.0, 0.5), turn=st.floats(0.0, 6.3))
def test_the_two_parts_of_a_cut_ball_make_the_whole(level, tilt, turn):
    mesh = ball(size=0.3)
    c, s = math.cos(tilt), math.sin(tilt)
    about_y = np.array([[c, 0, s], [0, 1, 0], [-s, 0, c]])
    c, s = math.cos(turn), math.sin(turn)
    about_z = np.array([[c, -s, 0], [s, c, 0], [0, 0, 1]])
    mesh = mesh.with_points(mesh.points @ (about_y @ about_z).T)
    low, high = below(mesh, level, 1e-6), above(mesh, level, 1e-6)
    for part in (low, high):
        rim = part.points[np.concatenate(boundary_loops(part.triangles)), 2]
        assert np.all(rim == level)
        assert find_faults(part, open_at=[level]) in ([], _degenerate_only(part, level))
    assert low.areas.sum() + high.areas.sum() == pytest.approx(mesh.areas.sum(), rel=1e-5)
    volume = hydrostatics(low.flipped()).volume + hydrostatics(high.flipped()).volume
    assert volume == pytest.approx(hydrostatics(mesh.flipped()).volume, rel=1e-5)


def _degenerate_only(mesh, level):
    """Slivers are the remesher's business; nothing else may be wrong after a cut."""
    return [fault for fault in find_faults(mesh, open_at=[level]) if fault.kind == "degenerate"]


def test_cutting_what_is_already_cut_changes_nothing():
    mesh = box(4, 2, 1, 0.3).flipped()
    again = below(mesh, 0.0, 1e-6)
    np.testing.assert_array_equal(again.points, mesh.points)
    np.testing.assert_array_equal(again.triangles, mesh.triangles)


def test_points_a_hair_under_the_waterline_are_put_on_it_and_lids_dropped():
    mesh = moved(closed_box(), [0, 0, -1.5 - 4e-6])  # deck at the waterline, a hair under
    cut = below(mesh, 0.0, 1e-5)
    assert hydrostatics(cut.flipped()).volume == pytest.approx(6 * 2 * 3, rel=1e-5)
    assert np.all(cut.points[boundary_loops(cut.triangles)[0], 2] == 0.0)
    assert len(cut.triangles) < len(mesh.triangles)


# attitude: every figure from the geometry of a box


def test_draught_is_the_depth_of_the_lowest_point():
    hull = prepare_hull(closed_box(), "b", draught=1.2)
    assert hull.hydrostatics.draught == pytest.approx(1.2, rel=1e-12)
    assert hull.hydrostatics.volume == pytest.approx(6 * 2 * 1.2, rel=1e-12)


def test_trim_is_bow_down_and_heel_is_port_up():
    whole = closed_box()
    bow_down = put_in_water(whole, "b", trim=0.1).mesh.points
    assert bow_down[whole.points[:, 0] == 3.0, 2].mean() == pytest.approx(-3 * math.sin(0.1))
    port_up = put_in_water(whole, "b", heel=0.1).mesh.points
    assert port_up[whole.points[:, 1] == 1.0, 2].mean() == pytest.approx(math.sin(0.1))


@settings(deadline=None, max_examples=25)
@given(trim=st.floats(-0.2, 0.2), heel=st.floats(-0.3, 0.3))
def test_a_box_turned_about_its_middle_stays_half_under(trim, heel):
    # by symmetry about the centre; the waterplane is 6 x 2 over the cosine of the tilt
    hull = prepare_hull(closed_box(size=1.0), "b", trim=trim, heel=heel)
    assert hull.hydrostatics.volume == pytest.approx(18.0, rel=1e-4)
    tilt = math.cos(trim) * math.cos(heel)
    assert hull.hydrostatics.waterplane_area == pytest.approx(12.0 / tilt, rel=1e-4)


def test_a_trimmed_box_has_the_wedge_shift_of_the_metacentre():
    # BM = I/V, exact for a wall-sided hull: x of buoyancy = BM tan a (1 + tan^2 a/2) in ship axes
    angle, bm = 0.1, (2 * 6.0**3 / 12) / 18.0
    along = bm * math.tan(angle)
    down = 0.75 - 0.5 * bm * math.tan(angle) ** 2  # below the middle of the box
    expected = along * math.cos(angle) - down * math.sin(angle)
    centre = prepare_hull(closed_box(), "b", trim=angle).hydrostatics.centre_of_buoyancy
    assert centre[0] == pytest.approx(expected, rel=1e-4)


@pytest.mark.parametrize(
    ("up", "axes"),
    [("y", [0, 2, 1]), ("x", [2, 1, 0]), ("-z", [0, 1, 2]), ("-y", [0, 2, 1]), ("-x", [2, 1, 0])],
)
def test_up_axis(up, axes):
    # write the box with its height along the file's up axis, by a turn (no mirror image)
    whole = closed_box(6, 2, 3)
    turned = whole.points[:, axes]
    swapped = axes != [0, 1, 2]
    mesh = whole.with_points(turned)
    if swapped:  # exchanging two axes mirrors
        mesh = mesh.flipped()
    hull = prepare_hull(mesh, "b", up=up, draught=1.0)
    data = hull.hydrostatics
    assert (data.length, data.beam) == pytest.approx((6.0, 2.0))
    assert data.volume == pytest.approx(12.0, rel=1e-9)


def test_scale_position_and_heading():
    mesh = moved(closed_box(), [1.0, 0.0, 0.0])
    hull = prepare_hull(
        mesh.with_points(mesh.points * 1000),
        "b",
        scale=0.001,
        position=(10.0, 20.0),
        heading=math.pi / 2,
        centre_of_mass=(1.0, 0.0, 0.25),
    )
    middle = hull.mesh.points.mean(axis=0)
    assert middle[:2] == pytest.approx([10.0, 21.0], abs=1e-9)
    assert hull.hydrostatics.centre_of_buoyancy[:2] == pytest.approx([1.0, 0.0], abs=1e-9)
    assert hull.heading == pytest.approx(math.pi / 2)
    assert hull.centre_of_mass.tolist() == [1.0, 0.0, 0.25]
    assert hull.place(hull.centre_of_mass) == pytest.approx([10.0, 21.0, 0.25])
    assert np.all(hull.mesh.points[hull.waterlines[0], 2] == 0.0)
    elsewhere = hull.moved((0.0, 0.0), 0.0)
    assert elsewhere.mesh.points.mean(axis=0)[:2] == pytest.approx([1.0, 0.0], abs=1e-9)
    assert np.all(elsewhere.mesh.points[hull.waterlines[0], 2] == 0.0)


def test_centre_of_mass_goes_down_with_the_draught():
    mesh = moved(closed_box(), [0, 0, 1.5])  # the file's z = 0 is the keel
    hull = prepare_hull(mesh, "b", draught=1.0, centre_of_mass=(0.0, 0.0, 1.4))
    assert hull.centre_of_mass == pytest.approx([0.0, 0.0, 0.4])
    assert prepare_hull(mesh, "b", draught=1.0).centre_of_mass == pytest.approx([0, 0, 0])


def test_normals_end_out_of_the_water_and_the_waterline_runs_counter_clockwise():
    hull = prepare_hull(ball(), "s")
    assert np.all(np.sum(hull.mesh.normals * hull.mesh.centroids, axis=1) < 0)
    x, y = hull.polygons()[0].T
    assert np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y) > 0


@pytest.mark.parametrize("bottom", [-8.0, -10.0, -12.5])
def test_a_body_is_cut_at_the_bed_as_at_the_waterline(bottom):
    lower = cylinder(2.0, 6.0, 0.8)  # make a closed column from z = bottom to z = 4
    column = lower.with_points(lower.points * [1, 1, -(bottom - 4.0) / 6.0] + [0, 0, 4.0])
    hull = prepare_hull(column.flipped(), "c", depth=10.0)
    under = min(10.0, -bottom)
    assert hull.hydrostatics.volume == pytest.approx(math.pi * 4 * under, rel=1e-6)
    assert hull.hydrostatics.centre_of_buoyancy[2] == pytest.approx(-0.5 * under, rel=1e-6)
    open_ends = {float(z) for loop in boundary_loops(hull.mesh.triangles)
                 for z in hull.mesh.points[loop, 2]}  # fmt: skip
    assert open_ends == ({0.0} if bottom == -8.0 else {0.0, -10.0})


def test_a_column_open_at_the_bed_is_taken():
    hull = prepare_hull(cylinder(2.0, 10.0, 0.8, stands_on_bed=True).flipped(), "c", depth=10.0)
    assert hull.hydrostatics.volume == pytest.approx(math.pi * 40.0, rel=1e-9)
    assert len(hull.waterlines) == 1


# parts


def test_width_of_a_part_is_its_least_across_under_water():
    plate = moved(closed_box(4.0, 0.12, 2.0, 0.5), [3.0, 1.0, -2.0])
    for angle in (0.0, 0.3, 2.0):
        assert width_under_water(turned(plate, angle)) == pytest.approx(0.12, rel=1e-9)
    leg = moved(turned(plate, 0.3), [0.0, 0.0, 1.7])  # mostly above
    assert width_under_water(leg) == pytest.approx(0.12, rel=1e-9)
    assert width_under_water(moved(plate, [0.0, 0.0, 4.0])) is None
    sheet = plate.with_points(plate.points * [1.0, 0.0, 1.0])
    assert width_under_water(turned(sheet, 0.3)) == pytest.approx(0.0, abs=1e-12)


def test_parts_are_left_out_by_piece_and_by_name():
    rudder = moved(closed_box(0.5, 0.1, 1.0, 0.2), [-4.0, 0, -1.0])
    whole = joined([closed_box().renamed("hull"), rudder.renamed("rudder")])
    by_name = prepare_hull(whole, "b", without=["rudder"])
    nameless = SurfaceMesh.of_one_part(whole.points, whole.triangles, "unnamed")
    by_piece = prepare_hull(nameless, "b", without=["piece2"])
    for hull in (by_name, by_piece):
        assert hull.hydrostatics.volume == pytest.approx(18.0, rel=1e-9)
        ((name, width),) = hull.left_out
        assert name in ("rudder", "piece2")
        assert width == pytest.approx(0.1, rel=1e-9)
    with pytest.raises(InputError, match="piece1, piece2"):
        prepare_hull(nameless, "b", without=["keel"])
    with pytest.raises(InputError, match="no triangles are left"):
        prepare_hull(nameless, "b", without=["piece1", "piece2"])


# faults, each on a mesh made to have it


def broken(kind):
    mesh = ball(size=0.3)
    t = mesh.triangles.copy()
    lowest = np.argsort(mesh.centroids[:, 2])
    match kind:
        case "hole":
            t = np.delete(t, lowest[3], axis=0)
        case "flipped":
            t[lowest[3]] = t[lowest[3], ::-1]
        case "inside out":
            t = t[:, ::-1]
        case "duplicate":
            t = np.concatenate([t, t[lowest[3:4]]])
        case "non-manifold":
            fin = [[t[lowest[3], 0], t[lowest[3], 1], t[lowest[-1], 0]]]
            t = np.concatenate([t, fin])
        case "degenerate":
            a, b, c = t[lowest[3]]
            middle = 0.5 * (mesh.points[a] + mesh.points[b])
            n = len(mesh.points)
            points = np.concatenate([mesh.points, [middle]])
            t = np.concatenate([np.delete(t, lowest[3], axis=0), [[a, n, c], [n, b, c], [a, b, n]]])
            return SurfaceMesh.of_one_part(points, t, "unnamed")
    return SurfaceMesh.of_one_part(mesh.points, t, "unnamed")


KINDS = ["hole", "flipped", "inside out", "duplicate", "non-manifold", "degenerate"]


@pytest.mark.parametrize("kind", KINDS)
def test_each_fault_is_found_and_refused(kind):
    mesh = broken(kind)
    assert kind in {fault.kind for fault in find_faults(mesh)}
    with pytest.raises(InputError) as caught:
        prepare_hull(mesh, "s", source="ball.stl")
    assert str(caught.value).startswith("ball.stl, under water: ")
    first = next(fault for fault in find_faults(mesh) if fault.kind == kind)
    assert first.text in str(caught.value) or kind in ("hole", "inside out")


def test_a_sound_mesh_has_no_faults():
    assert find_faults(ball()) == []


def test_a_skeg_sunk_into_the_hull_is_found():
    # two sound closed solids that overlap: nothing but the crossing tells
    skeg = moved(closed_box(2.0, 0.2, 1.0, 0.2), [-2.03, 0.04, -1.47])
    mesh = joined([closed_box(), skeg])
    assert [fault.kind for fault in find_faults(mesh)] == ["self-intersection"]
    with pytest.raises(InputError, match=r"self-intersection.*unite the solids"):
        prepare_hull(mesh, "b")
    clear = joined([closed_box(), moved(skeg, [0.0, 0.0, -0.6])])
    assert find_faults(clear) == []


def test_a_folded_skin_is_found():
    mesh = ball(size=0.3)
    lowest = np.argmin(mesh.points[:, 2])
    points = mesh.points.copy()
    points[lowest] = [0.11, 0.23, 1.5]  # the bottom pulled out through the top
    assert "self-intersection" in {fault.kind for fault in find_faults(mesh.with_points(points))}


@settings(deadline=None, max_examples=40)
@given(seed=st.integers(0, 2**32 - 1), tilt=st.floats(0.05, 1.4))
def test_piercing_is_told_apart_from_missing(seed, tilt):
    # a triangle and a separate one whose one edge runs through it, or past it, by construction
    rng = np.random.default_rng(seed)
    base = np.array([[0, 0, 0], [4, 0, 0], [0, 4, 0.0]])
    weights = rng.dirichlet([2, 2, 2])
    through = weights @ base
    direction = np.array([math.cos(tilt) * rng.choice([-1, 1]), 0.3, math.sin(tilt)])
    past = np.array([5.0, 5.0, 0.0])
    for target, count in ((through, 1), (past, 0)):
        p, q = target - direction, target + direction
        far = target + direction + np.array([20.0, 20.0, 7.0])
        mesh = SurfaceMesh.of_one_part(np.stack([*base, p, q, far]), [[0, 1, 2], [3, 4, 5]], "a")
        pierced = piercing_edges(mesh)
        assert any(np.allclose(middle, target) for middle in pierced) == bool(count)


def test_faults_above_water_do_not_matter():
    mesh = ball(size=0.3)
    highest = np.argmax(mesh.centroids[:, 2])
    hull = prepare_hull(mesh.keep(np.arange(len(mesh.triangles)) != highest), "s")
    assert hull.hydrostatics.volume > 0


def test_one_piece_inside_out_among_sound_ones_is_found():
    other = moved(ball(0.5, 0.2), [5, 0, 0]).flipped()
    fault = find_faults(joined([ball(), other]))
    assert [(f.kind, f.count) for f in fault] == [("inside out", 1)]


@pytest.mark.parametrize(
    ("change", "values", "says"),
    [
        (lambda m: moved(m, [0, 0, 1.5]), {}, "above still water .* give its draught"),
        (lambda m: m.with_points(m.points * 1000), {}, "scale = 0.001"),
        (lambda m: moved(m, [0, 1, 0]), {}, 'up = "y"'),
        (lambda m: m, {"draught": 3.5}, "whole hull is under water"),
        (lambda m: m, {"up": "up"}, "expected one of z, -z, y"),
        (lambda m: moved(m, [0, 0, -12]), {"depth": 10.0}, "under the bed"),
    ],
)
def test_what_users_bring_gets_one_sentence(change, values, says):
    with pytest.raises(InputError, match=says) as caught:
        prepare_hull(change(closed_box()), "b", source="b.stl", **values)
    assert "\n" not in str(caught.value)


def test_what_the_user_insists_on_is_believed():
    tall = moved(closed_box(), [0, 1, 0])
    assert prepare_hull(tall, "b", up="z").hydrostatics.volume == pytest.approx(18.0)
    long = closed_box()
    long = long.with_points(long.points * 1000)
    assert prepare_hull(long, "b", scale=1.0).hydrostatics.length == pytest.approx(6000.0)


def test_welding_is_told():
    whole = ball(size=0.3)
    soup = SurfaceMesh.of_one_part(
        whole.vertices.reshape(-1, 3), np.arange(3 * len(whole.triangles)), "unnamed"
    )
    assert "merged" in prepare_hull(soup, "s").notes[0]
    assert prepare_hull(whole, "s").notes == ()
    assert prepare_hull(whole, "s", draught=0.9).notes == ("cut, not remeshed",)


def test_a_seam_needs_a_larger_weld_tolerance():
    whole = ball(size=0.3)
    rng = np.random.default_rng(1)
    soup = whole.vertices.reshape(-1, 3) + rng.uniform(-1e-4, 1e-4, (3 * len(whole.triangles), 3))
    mesh = SurfaceMesh.of_one_part(soup, np.arange(len(soup)), "unnamed")
    with pytest.raises(InputError, match="weld tolerance"):
        prepare_hull(mesh, "s")
    hull = prepare_hull(mesh, "s", weld_tolerance=1e-3)
    assert hull.hydrostatics.volume == pytest.approx(2 / 3 * math.pi, rel=0.02)


# remeshing


@pytest.mark.parametrize("trim", [0.0, 0.15])
def test_remeshing_keeps_edges_levels_and_volume(needs_gmsh, trim):
    hull = prepare_hull(closed_box(), "b", trim=trim, panel_size=0.4)
    mesh = hull.mesh
    assert np.all(mesh.points[hull.waterlines[0], 2] == 0.0)
    assert find_faults(mesh.flipped(), open_at=[0.0]) == []
    # flat sides and kept edges: nothing is lost to chords
    before, after = hull.hydrostatics_before, hull.hydrostatics
    assert after.volume == pytest.approx(before.volume, rel=1e-6)
    assert after.waterplane_area == pytest.approx(before.waterplane_area, rel=1e-6)
    assert quality(mesh).min() > 0.3
    assert "remeshed at 0.4 m, edges over 40 degrees kept: volume" in hull.notes[-1]


def test_remeshing_a_ball_loses_the_chord_volume_and_says_so(needs_gmsh):
    error = []
    for size in (0.2, 0.1):
        hull = prepare_hull(ball(size=0.02), "s", panel_size=size)
        error.append(1 - hull.hydrostatics.volume / (2 / 3 * math.pi))
        assert np.all(np.sum(hull.mesh.normals * hull.mesh.centroids, axis=1) < 0)
        assert hull.hydrostatics_before.volume > hull.hydrostatics.volume
    assert error[1] < 0.004
    assert np.log2(error[0] / error[1]) == pytest.approx(2.0, abs=0.4)


@pytest.mark.parametrize(
    ("draught", "trim", "heel"), [(1.39, 5, -15), (1.84, 4, -10), (1.54, 6, 15)]
)
def test_a_hull_whose_sharp_edges_fade_out_is_remeshed(needs_gmsh, draught, trim, heel):
    # bow down: the tender's stem runs out into her bottom and leaves no closed faces
    tender = read_mesh(Path(__file__).parents[2] / "meshes" / "tender.stl")
    angles = {"trim": math.radians(trim), "heel": math.radians(heel)}
    hull = prepare_hull(tender, "t", draught=draught, panel_size=0.6, **angles)
    assert hull.hydrostatics.volume == pytest.approx(hull.hydrostatics_before.volume, rel=0.015)
    assert find_faults(hull.mesh.flipped(), open_at=[0.0]) == []
    assert quality(hull.mesh).min() > 0.2


def test_a_mesh_that_needs_nothing_is_taken_as_it_is_without_the_mesher(monkeypatch):
    def no_mesher(*args, **kwargs):
        raise AssertionError("the mesher was called")

    monkeypatch.setattr("bemwave.geometry.remesh.run_job", no_mesher)
    mesh = box(6, 2, 1.5, 0.5)
    hull = prepare_hull(mesh.flipped(), "b", panel_size=0.55)
    np.testing.assert_array_equal(hull.mesh.points, mesh.points)
    assert hull.notes == ("taken as it is: already meshed at the panel size",)
    with pytest.raises(AssertionError, match="mesher was called"):
        prepare_hull(mesh.flipped(), "b", panel_size=0.2)


def test_panels_too_large_for_the_hull_are_refused(needs_gmsh):
    with pytest.raises(InputError, match="smaller panel_size"):
        prepare_hull(ball(size=0.1), "s", panel_size=1.0)
