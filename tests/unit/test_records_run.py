import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.sparse.linalg import spsolve

import bemwave
from bemwave.errors import InputError
from bemwave.flow.samplers import PanelSamplers
from bemwave.flow.state import SurfaceState
from bemwave.geometry import forms
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.files import write_mesh
from bemwave.geometry.hull import place_hull
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.surface_mesh import joined
from bemwave.geometry.water_surface import water_surface
from bemwave.kernels.panels import SEVEN
from bemwave.records import HistoryFile, Manifest, create_folder, write_manifest
from bemwave.waves import Sea
from bemwave.waves.sea_file import write_sea

CASE = """
[water]
depth = "deep"
[surface]
size = [16.0, 16.0]
spacing = 1.0
[run]
duration = 2.0
record_every = 0.25
[[body]]
name = "buoy"
form = "sphere"
radius = 0.5
centre_depth = 3.0
position = [4.0, 0.0]
"""
SEA = Sea.of([1.2], [0.5], [0.1], [0.3], depth=math.inf)
WIDTH, W = 2.0, 1.1  # a swelling and sinking bell of water: not a wave, but its field is known


def bell(points):
    return np.exp(-np.sum(points[..., :2] ** 2, axis=-1) / (2 * WIDTH**2))


def projected_bell(elements):
    """Nodal values of the linear function nearest to the bell, as a Galerkin solution has them."""
    load = np.zeros(len(elements.points))
    corners = elements.points[elements.water]
    areas = 0.5 * np.linalg.norm(
        np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1
    )
    for *shares, weight in SEVEN:
        value = bell(np.einsum("j,mjc->mc", shares, corners))
        for j in range(3):
            np.add.at(load, elements.water[:, j], areas * weight * shares[j] * value)
    return spsolve(elements.mass.tocsc(), load[: elements.free])


def write_run(path):
    """A run folder whose solved field is the bell, the submerged buoy left out of the flow."""
    folder = create_folder(path, CASE)
    water = water_surface(Rectangle(-12, 12, -12, 12), 1.0)
    mesh = boundary_mesh(water, [], depth=math.inf)
    buoy = place_hull("buoy", forms.sphere(0.5, 3.0, 0.25), position=(4.0, 0.0)).mesh
    both = joined([mesh, buoy])
    write_mesh(both, folder.mesh)
    write_sea(SEA, folder.sea)
    write_manifest(
        Manifest({}, 1, "panels", "a test", False, (), both.part_names, "finished"),
        folder.manifest,
    )
    elements = PanelSamplers(both, math.inf, closed=False).elements
    hull_nodes = elements.points[elements.free : elements.nodes]
    panels = elements.points[elements.hull].mean(axis=1)
    nodes, shape = elements.points[: elements.free], projected_bell(elements)
    out = HistoryFile(folder.history, nodes, hull_nodes, panels)
    for time in np.arange(9) * 0.25:
        out.append(state_at(time, shape, len(hull_nodes), len(panels)))
    out.flush()
    return folder


def state_at(time, shape, hull_nodes, panels):
    cos, sin = math.cos(W * time), math.sin(W * time)
    # the hull's part is zero: potential and flux there are those of a body that is not there
    return SurfaceState(
        time=time,
        elevation=shape * sin / W,
        potential=shape * cos,
        potential_rate=-W * shape * sin,
        surface_flux=shape * cos,
        surface_flux_rate=-W * shape * sin,
        hull_potential=np.zeros(hull_nodes),
        hull_potential_rate=np.zeros(hull_nodes),
        hull_flux=np.zeros(panels),
        hull_flux_rate=np.zeros(panels),
    )


@pytest.fixture(scope="module")
def run(tmp_path_factory):
    return bemwave.open_run(write_run(tmp_path_factory.mktemp("runs") / "out").path)


def test_a_run_tells_what_it_is(run):
    assert run.case.run.duration == 2.0
    assert run.mesh.part_names == ("water", "buoy")
    np.testing.assert_array_equal(run.sea.amplitude, SEA.amplitude)
    np.testing.assert_array_equal(run.times, np.arange(9) * 0.25)
    assert run.manifest.status == "finished"


def test_elevation_is_the_sum_of_both_parts_at_any_place_and_time(run):
    x, y = np.meshgrid([-3.1, 0.0, 1.7], [0.4, 2.3], indexing="ij")
    times = np.array([0.5, 1.13])
    got = run.elevation(x, y, times)
    assert got.shape == (2, 3, 2)
    plan = np.column_stack([x.ravel(), y.ravel()])
    for k, time in enumerate(times):
        want = SEA.elevation(x, y, time) + bell(plan).reshape(3, 2) * math.sin(W * time) / W
        # the recovery's own error at four panels a width: half a per cent of the bell's height
        np.testing.assert_allclose(got[k], want, atol=0.01 * math.sin(W * time) / W)
    assert run.elevation(0.0, 0.0, 0.5).shape == ()


def test_velocity_under_the_bell_is_that_of_its_harmonic_continuation(run):
    # potential int k s^2 exp(-k^2 s^2/2) exp(kz) dk on the axis (Hankel transform of the bell)
    for depth in (2.0, 4.0):
        vertical, _ = quad(
            lambda k, z: k**2 * WIDTH**2 * math.exp(-((k * WIDTH) ** 2) / 2 - k * z),
            0,
            12,
            args=(depth,),
        )
        got = run.velocity([[0.0, 0.0, -depth]], 0.6)[0]
        want = SEA.velocity([[0.0, 0.0, -depth]], 0.6)[0] + [0, 0, vertical * math.cos(W * 0.6)]
        np.testing.assert_allclose(got, want, atol=0.01 * vertical)


def test_there_is_no_velocity_in_air_nor_in_a_hull(run):
    got = run.velocity([[0.0, 0.0, 2.0], [4.0, 0.0, -3.0], [1.0, 0.0, -3.0]], [0.5, 1.0])
    assert got.shape == (2, 3, 3)
    assert np.isnan(got[:, :2]).all()
    assert np.isfinite(got[:, 2]).all()


def test_places_and_times_outside_are_refused(run):
    with pytest.raises(InputError, match=r"\(9, 0\), outside the useful water"):
        run.elevation(9.0, 0.0, 0.5)
    with pytest.raises(InputError, match=r"time 2\.5 s was asked for.*from 0 to 2 s"):
        run.velocity([[0.0, 0.0, -1.0]], 2.5)


def test_a_folder_without_a_run_is_told(tmp_path):
    with pytest.raises(InputError, match="holds no run"):
        bemwave.open_run(tmp_path)
