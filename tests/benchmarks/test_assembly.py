"""Time to integrate 1/r over all pairs of panels of a sphere, ours and a general library's.

Run with: python -m pytest tests/benchmarks --benchmark-only. Both are warmed up and use all cores;
both give the single layer of uniform triangles of the same mesh.
"""

import time

import numba
import numpy as np
import pytest

from bemwave.kernels import panels as kernel

LEVEL = 4  # 2048 triangles
IDENTITY = (np.ones((1, 3)), np.zeros((1, 3)), np.ones((1, 1)))

pytestmark = pytest.mark.filterwarnings("default")  # the library's own are not ours to answer


@pytest.fixture(scope="module")
def library():
    """The general boundary-element library bempp-cl, and its sphere."""
    api = pytest.importorskip("bempp_cl.api")
    return api, api.shapes.regular_sphere(LEVEL)


def packed(grid):
    return kernel.pack(np.ascontiguousarray(grid.vertices.T[grid.elements.T]))


def by_library(api, grid):
    space = api.function_space(grid, "DP", 0)
    operator = api.operators.boundary.laplace.single_layer(
        space, space, space, device_interface="numba"
    )
    return np.asarray(operator.weak_form().to_dense())


def least_time(work, times=5):
    """After one call to warm up."""
    work()
    taken = []
    for _ in range(times):
        start = time.perf_counter()
        work()
        taken.append(time.perf_counter() - start)
    return min(taken)


def test_single_layer_against_a_general_library(benchmark, library):
    api, grid = library
    table = packed(grid)
    ours = benchmark.pedantic(
        kernel.single_layer_self, (table, *IDENTITY), rounds=5, warmup_rounds=1
    )[0]
    theirs = by_library(api, grid)
    # two rules for the same integrals, measured .2 % of the largest, on pairs that touch
    assert np.abs(ours - theirs).max() < 5e-3 * theirs.max()
    library_time = least_time(lambda: by_library(api, grid))
    our_time = benchmark.stats.stats.min
    per_pair = 1e9 * numba.get_num_threads() / len(table) ** 2
    benchmark.extra_info["ns a pair and core"] = round(our_time * per_pair, 1)
    benchmark.extra_info["library, ns a pair and core"] = round(library_time * per_pair, 1)
    # measured on two quiet cores: 58 and 122 ns a pair and core; on two busy ones 169 and 286
    assert our_time <= library_time


def test_double_layer(benchmark, library):
    """Linear dipoles, all of whose pairs are computed; for the record, nothing to compare with."""
    _, grid = library
    table = packed(grid)
    corners = grid.elements.T.astype(np.int64)
    nodes = grid.number_of_vertices
    signs, shifts, weights = IDENTITY
    layer = benchmark.pedantic(
        kernel.double_layer,
        (table, table, corners, nodes, signs, shifts, weights[:, 0]),
        rounds=5,
        warmup_rounds=1,
    )
    per_pair = 1e9 * numba.get_num_threads() / len(table) ** 2
    benchmark.extra_info["ns a pair and core"] = round(benchmark.stats.stats.min * per_pair, 1)
    # Gauss: uniform dipoles on a closed surface are half a jump; normals are out of the sphere
    np.testing.assert_allclose(layer.sum(axis=1), -0.5 * table[:, 28], rtol=2e-3)
