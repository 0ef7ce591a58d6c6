import math

import netCDF4
import numpy as np
import pytest
from scipy.integrate import quad
from scipy.sparse.linalg import spsolve
from scipy.special import j0

import bemwave
from bemwave.case.output import Handoff as Entry
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
from bemwave.handoff import Handoff, closure_figure, divergence_figure
from bemwave.kernels.panels import SEVEN
from bemwave.records import BodiesFile, HistoryFile, Manifest, Rest, create_folder, write_manifest
from bemwave.waves import Sea
from bemwave.waves.sea_file import write_sea

CASE = """
[water]
depth = "deep"
[surface]
size = [16.0, 16.0]
spacing = 0.75
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
# Water driven by a bell of potential on z = 0 that comes and goes: no free wave, but its field is
# known, phi = int k s^2 exp(-k^2 s^2/2) J0(kr) exp(kz) dk (the bell's Hankel transform).
WIDTH, W = 2.5, 1.1


def bell(points):
    return np.exp(-np.sum(points[..., :2] ** 2, axis=-1) / (2 * WIDTH**2))


def rise(points):
    """Vertical velocity at z = 0 under a bell of height 1."""
    k, weight = np.polynomial.legendre.leggauss(60)
    k, weight = 2.5 * (k + 1), 2.5 * weight
    radius = np.linalg.norm(points[..., :2], axis=-1)
    return j0(radius[..., None] * k) @ (weight * k**2 * WIDTH**2 * np.exp(-((k * WIDTH) ** 2) / 2))


def projected(function, elements):
    """Nodal values of the nearest piecewise linear function, as a Galerkin solution has them."""
    load = np.zeros(len(elements.points))
    corners = elements.points[elements.water]
    areas = 0.5 * np.linalg.norm(
        np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1
    )
    for *shares, weight in SEVEN:
        value = function(np.einsum("j,mjc->mc", shares, corners))
        for j in range(3):
            np.add.at(load, elements.water[:, j], areas * weight * shares[j] * value)
    return spsolve(elements.mass.tocsc(), load[: elements.free])


def write_run(path):
    """A run folder whose solved field is the bell's, the submerged buoy left out of the flow."""
    folder = create_folder(path, CASE)
    water = water_surface(Rectangle(-12, 12, -12, 12), 0.75)
    mesh = boundary_mesh(water, [], depth=math.inf)
    buoy = place_hull("buoy", forms.sphere(0.5, 3.0, 0.25), position=(4.0, 0.0), heading=0.5)
    both = joined([mesh, buoy.mesh])
    write_mesh(both, folder.mesh)
    write_sea(SEA, folder.sea)
    write_manifest(
        Manifest(
            inputs={},
            threads=1,
            route="panels",
            reason="a test",
            closed=False,
            mirrors=(),
            part_names=both.part_names,
            shortest_period=2.0,
            peak_period=4.0,
            bodies={"buoy": Rest.of(buoy)},
            status="finished",
        ),
        folder.manifest,
    )
    bodies = BodiesFile(folder.bodies, np.arange(9) * 0.25, ["buoy"])
    elements = PanelSamplers(both, math.inf, closed=False).elements
    hull_nodes = elements.points[elements.free : elements.nodes]
    panels = elements.points[elements.hull].mean(axis=1)
    nodes = elements.points[: elements.free]
    shapes = projected(bell, elements), projected(rise, elements)
    out = HistoryFile(folder.history, np.arange(9) * 0.25, nodes, hull_nodes, panels)
    for time in np.arange(9) * 0.25:
        out.add(state_at(time, shapes, len(hull_nodes), len(panels)))
        bodies.add(time, np.zeros((1, 6)), velocity_at(time), {})
    out.flush()
    bodies.flush()
    return folder


def velocity_at(time):
    return np.arange(6).reshape(1, 6) * math.sin(W * time)


def state_at(time, shapes, hull_nodes, panels):
    pushed, risen = shapes
    cos, sin = math.cos(W * time), math.sin(W * time)
    # the hull's part is zero: potential and flux there are those of a body that is not there
    return SurfaceState(
        time=time,
        elevation=risen * sin / W,
        potential=pushed * cos,
        potential_rate=-W * pushed * sin,
        surface_flux=risen * cos,
        surface_flux_rate=-W * risen * sin,
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
        want = SEA.elevation(x, y, time) + rise(plan).reshape(3, 2) * math.sin(W * time) / W
        # the recovery's own error at four panels a width
        np.testing.assert_allclose(got[k], want, atol=0.01 * rise(np.zeros(2)) / W)
    assert run.elevation(0.0, 0.0, 0.5).shape == ()


def test_velocity_under_the_bell_is_that_of_its_harmonic_continuation(run):
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


def test_a_hull_stands_where_it_rested(run):
    (buoy,) = run.hulls
    assert (buoy.name, buoy.heading) == ("buoy", pytest.approx(0.5))
    np.testing.assert_allclose(buoy.place.shift, [4.0, 0.0, 0.0])
    np.testing.assert_allclose(buoy.mesh.points.mean(axis=0), [4.0, 0.0, -3.0], atol=1e-9)
    for time in (0.5, 0.6):
        # the cubic through four records: 3/128 (w dt)^4 at most
        got = run.body_velocities(time)
        np.testing.assert_allclose(got, velocity_at(time), atol=5 * 3 / 128 * (W * 0.25) ** 4)
    np.testing.assert_allclose(run.body_velocities(0.5), velocity_at(0.5), rtol=1e-14)


def test_a_new_handoff_can_be_taken_from_it(run, tmp_path):
    box = {"centre": [4.0, 0.0], "size": [4.0, 4.0], "bottom": -5.0, "top": 1.0}
    entry = Entry(
        name="again", box=box, spacing=(0.25, 0.25), every=0.4, end=2.0, volume_at_start=True
    )
    handoff = Handoff(entry, run.case, run.scene, tmp_path)
    for time in handoff.times:
        handoff.write(run.state(time), run.body_velocities(time))
    handoff.flush()
    with netCDF4.Dataset(tmp_path / "again.nc") as file:
        assert len(file["time"][:]) == 6
        # the contract's limit, 1 % of the largest face flux, on the real samplers
        balance = [file[n][:].data for n in ("net_flux", "volume_rate", "largest_face_flux")]
        assert closure_figure(*balance) < 0.01
        cells = [file[n][:].data for n in ("cell_net_flux", "cell_face_flux")]
        assert divergence_figure(*cells) < 0.01
    with netCDF4.Dataset(tmp_path / "again-start.nc") as file:
        points = np.column_stack([file[n][:] for n in "xyz"])
        inside = np.linalg.norm(points - [4.0, 0.0, -3.0], axis=1) < 0.5
        under = points[:, 2] < -1
        assert inside.any()
        np.testing.assert_array_equal(file["wet"][0][under] == 0, inside[under])


def test_places_and_times_outside_are_refused(run):
    with pytest.raises(InputError, match=r"\(9, 0\), outside the useful water"):
        run.elevation(9.0, 0.0, 0.5)
    with pytest.raises(InputError, match=r"time 2\.5 s was asked for.*from 0 to 2 s"):
        run.velocity([[0.0, 0.0, -1.0]], 2.5)


def test_a_folder_without_a_run_is_told(tmp_path):
    with pytest.raises(InputError, match="holds no run"):
        bemwave.open_run(tmp_path)
