"""Edges, loops, pieces, welding."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from bemwave.geometry.forms import box, cylinder, sphere
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import attached, boundary_loops, extent, pieces, weld


def soup(mesh):
    """The same triangles, each with corners of its own, as an STL has them."""
    triangles = np.arange(3 * len(mesh.triangles)).reshape(-1, 3)
    return SurfaceMesh(mesh.vertices.reshape(-1, 3), triangles, mesh.part, mesh.part_names)


def test_normals_areas_and_centroids_of_a_known_triangle():
    mesh = SurfaceMesh.of_one_part([[0, 0, 0], [3, 0, 0], [0, 4, 0]], [[0, 1, 2]], "water")
    assert mesh.areas.tolist() == [6.0]
    assert mesh.normals.tolist() == [[0.0, 0.0, 1.0]]
    assert mesh.flipped().normals.tolist() == [[0.0, 0.0, -1.0]]
    assert mesh.centroids.tolist() == [[1.0, 4.0 / 3.0, 0.0]]


@pytest.mark.parametrize(
    ("triangles", "part", "says"),
    [([[0, 1, 3]], [0], "0 .. 2 exist"), ([[0, 1, 2]], [1], "part"), ([[0, 1, 2]], [], "entries")],
)
def test_indices_out_of_range_are_refused(triangles, part, says):
    with pytest.raises(ValueError, match=says):
        SurfaceMesh(np.eye(3), triangles, part, ["a"])


def test_a_mesh_cannot_be_changed_behind_its_back():
    mesh = box(2, 1, 1, 0.5)
    with pytest.raises(ValueError, match="read-only"):
        mesh.points[0, 0] = 1.0


def test_joining_merges_parts_of_one_name_only():
    mesh = joined([box(2, 1, 1, 1), sphere(1, 3, 0.5).renamed("ball"), box(1, 1, 1, 1)])
    assert mesh.part_names == ("hull", "ball")
    ball = mesh.keep(mesh.in_part("ball"))
    np.testing.assert_array_equal(ball.vertices, sphere(1, 3, 0.5).vertices)


@settings(deadline=None, max_examples=30)
@given(
    seed=st.integers(0, 2**32 - 1),
    jitter=st.floats(0.0, 0.4),
    size=st.floats(0.2, 0.7),
)
def test_weld_sews_a_jittered_soup_back_together(seed, jitter, size):
    whole = sphere(1.0, 2.0, size)
    tolerance = 1e-5
    loose = soup(whole)
    noise = np.random.default_rng(seed).uniform(-1, 1, loose.points.shape) / np.sqrt(3)
    mesh, merged, dropped = weld(
        loose.with_points(loose.points + jitter * tolerance * noise), tolerance
    )
    assert (len(mesh.points), dropped) == (len(whole.points), 0)
    assert merged == 3 * len(whole.triangles) - len(whole.points)
    assert boundary_loops(mesh.triangles) == []
    assert np.abs(mesh.vertices - whole.vertices).max() <= tolerance
    assert len(np.unique(np.sort(mesh.triangles, axis=1), axis=0)) == len(whole.triangles)


def test_weld_counts_what_collapses():
    points = [[0, 0, 0], [1, 0, 0], [0, 1, 0], [1, 1e-9, 0]]
    mesh, merged, dropped = weld(SurfaceMesh.of_one_part(points, [[0, 1, 2], [0, 3, 1]], "a"), 1e-6)
    assert (len(mesh.triangles), merged, dropped) == (1, 1, 1)


def test_loops_of_a_tube_run_opposite_ways_at_its_ends():
    tube = cylinder(1.0, 3.0, 0.5, stands_on_bed=True)
    loops = boundary_loops(tube.triangles)
    assert [len(loop) for loop in loops] == [16, 16]
    turns = []
    for loop in loops:
        x, y = tube.points[loop, :2].T
        turns.append((tube.points[loop[0], 2], np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y) > 0))
    # normals into the hull: counter-clockwise at the waterline, clockwise at the bed
    assert sorted(turns) == [(-3.0, False), (0.0, True)]


def test_edges_that_close_no_loop_are_refused():
    flipped = SurfaceMesh.of_one_part(
        [[0, 0, 0], [1, 0, 0], [0, 1, 0], [1, 1, 0]], [[0, 1, 2], [1, 2, 3]], "a"
    )
    with pytest.raises(ValueError, match="closed loops"):
        boundary_loops(flipped.triangles)


def test_pieces_come_by_area():
    small, large = sphere(0.2, 3, 0.05), sphere(1, 3, 0.5)  # the small one has more triangles
    mesh = joined([small, large])
    piece = pieces(mesh)
    assert len(small.triangles) > len(large.triangles)
    assert np.all(piece[: len(small.triangles)] == 1)
    assert np.all(piece[len(small.triangles) :] == 0)


def test_attaching_keeps_the_first_mesh_and_counts_missing_points():
    first = box(2, 2, 1, 1)
    second = first.with_points(first.points * [1, 1, -1]).flipped().renamed("above")
    both, missing = attached(first, second, second.points[:, 2] == 0.0)
    assert missing == 0
    assert len(both.points) == 2 * len(first.points) - np.count_nonzero(first.points[:, 2] == 0)
    assert boundary_loops(both.triangles) == []
    np.testing.assert_array_equal(both.points[: len(first.points)], first.points)
    away = second.with_points(second.points + np.array([0.1, 0, 0]))
    assert attached(first, away, away.points[:, 2] == 0.0)[1] == 8
    assert extent(first.points) == 3.0
