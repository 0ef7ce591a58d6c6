import math
import signal
import subprocess
import sys

import netCDF4
import numpy as np
import pytest
import xarray

from bemwave.case import Case
from bemwave.errors import InputError, RunError
from bemwave.flow.state import ARRAYS, SurfaceState
from bemwave.geometry import forms
from bemwave.geometry.hull import place_hull
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.handoff import Handoff, Scene, instants
from bemwave.handoff.netcdf import (
    RECORDS_PER_WRITE,
    Layout,
    SeriesFile,
    Variable,
    complete_records,
    read_times,
)
from bemwave.handoff.plan import water_quadrature
from bemwave.waves import Sea

SEA = Sea.of([1.0, 1.4], [0.2, -0.4], [0.3, 0.1], [0.0, 1.0], depth=20.0)
PERIOD = 2 * math.pi / 1.4


def state_at(time):
    return SurfaceState(time, **{name: np.zeros(0) for name in ARRAYS})


def water():
    x, y = np.meshgrid(*[np.linspace(-20, 20, 21)] * 2)
    points = np.column_stack([x.ravel(), y.ravel(), np.zeros(x.size)])
    mesh = SurfaceMesh.of_one_part(points, grid_triangles(20, 20), "water")
    return lambda box: water_quadrature(box, mesh)


def deliver(folder, entry, stop=None, keep=None, hulls=()):
    case = Case(
        water={"depth": 20.0},
        surface={"size": [40.0, 40.0], "spacing": 2.0},
        run={"duration": 4.0},
        handoff=[{"name": "box", **entry}],
    )
    scene = Scene(SEA, None, water(), hulls, shortest_period=PERIOD, peak_period=5.0)
    handoff = Handoff(case.handoff[0], case, scene, folder, keep)
    for time in handoff.times[slice(handoff.count, stop)]:
        handoff.write(state_at(time))
    handoff.flush()
    return handoff, folder / "box.nc"


BOX = {
    "box": {"centre": [2.0, -1.0], "size": [8.0, 6.0], "bottom": -5.0, "top": 1.5},
    "spacing": [2.0, 0.5],
    "every": 0.5,
    "zone": 2.0,
}


def test_a_handoff_file_has_what_the_contract_lists(tmp_path):
    handoff, path = deliver(tmp_path, BOX | {"field": "parts", "crest": "wheeler"})
    with netCDF4.Dataset(path) as file:
        assert file.data_model == "NETCDF4"
        assert file.Conventions == "CF-1.11"
        assert set(file.dimensions) == {"time", "point", "column"}
        assert np.array_equal(file["time"][:], np.arange(9) * 0.5)
        assert file["time"].units_metadata == "leap_seconds: none"
        assert file["face"].flag_meanings == "x_min x_max y_min y_max bottom top zone free"
        assert file["face"].flag_values.tolist() == list(range(8))
        shapes = {
            "point": "x y z nx ny nz face area zone_weight zone_rate",
            "column": "column_x column_y",
            "time point": "u v w p wet u_incident v_incident w_incident p_incident",
            "time column": "elevation elevation_incident",
            "time": "net_flux volume_rate wet_excess",
        }
        for dimensions, names in shapes.items():
            for name in names.split():
                assert file[name].dimensions == tuple(dimensions.split()), name
        assert all(v.units for v in file.variables.values())
        for name in ("x", "y", "z", "column_x", "column_y", "time"):
            assert file[name].dtype == np.float64
        # design.md, Precisions: 3.5/T_p times the weight
        np.testing.assert_allclose(file["zone_rate"][:], 3.5 / 5.0 * file["zone_weight"][:])
        assert file["zone_weight"][:].max() == 1.0
        # numerics.md, Hand-off: (w dt)^2/8
        error = (2 * math.pi / PERIOD * 0.5) ** 2 / 8
        assert file.linear_interpolation_error == pytest.approx(error, rel=1e-12)
        assert file.crest_rule == "wheeler"
        assert file.shortest_period_kept_s == PERIOD
        assert "spacing" in file.case
        assert "not for design" in file.caution.lower()
        assert "quadratic term" in file.pressure
        assert "quadratic term" in file["p"].comment
    assert handoff.times[-1] == 4.0


def test_the_incident_part_in_the_file_is_the_closed_form(tmp_path):
    # issue's table: 1e-12
    path = deliver(tmp_path, BOX)[1]
    with netCDF4.Dataset(path) as file:
        points = np.column_stack([file[n][:] for n in "xyz"])
        assert (points[:, 0].min(), points[:, 0].max()) == (-2.0, 6.0)  # plain earth coordinates
        under = points[:, 2] <= 0
        for k, time in enumerate(file["time"][:]):
            got = np.column_stack([np.ma.filled(file[n][k], np.nan) for n in "uvw"])
            wet = (file["wet"][k] > 0) & under
            want = SEA.velocity(points[wet], time)
            np.testing.assert_allclose(got[wet], want, rtol=0, atol=1e-12)
            p = np.ma.filled(file["p"][k], np.nan)
            np.testing.assert_allclose(
                p[wet], SEA.pressure(points[wet], time), rtol=1e-12, atol=1e-8
            )
            assert np.isnan(got[file["wet"][k] == 0]).all()
            columns = file["column_x"][:], file["column_y"][:]
            np.testing.assert_allclose(
                file["elevation"][k], SEA.elevation(*columns, time), atol=1e-12
            )


def test_a_turned_and_placed_box_speaks_in_its_own_axes(tmp_path):
    place = {"origin": [1.0, 2.0, -5.0], "heading": 40.0, "up": "y", "time_zero": 1.0}
    box = BOX["box"] | {"angle": 25.0}
    path = deliver(tmp_path, BOX | {"box": box, "place": place})[1]
    with netCDF4.Dataset(path) as file:
        there = np.column_stack([file[n][:] for n in "xyz"])
        velocity = np.column_stack([np.ma.filled(file[n][2], np.nan) for n in "uvw"])
        normals = np.column_stack([file[f"n{n}"][:] for n in "xyz"])
        assert file["time"][0] == -1.0
        wet, face, area = file["wet"][2] == 1, file["face"][:], file["area"][:]
        earth_origin, heading = file.axes_origin_on_earth_m, file.axes_heading_on_earth_degrees
        assert set(file.variables) >= {"column_z"}
    # by hand: y up means (x, y, z) -> (x, z, -y)
    a, b = np.radians(25.0), np.radians(40.0)
    level = np.column_stack([there[:, 0], -there[:, 2], there[:, 1]])
    in_box = rotated(level, b) + np.array([1.0, 2.0, -5.0])
    earth = rotated(in_box, a) + np.array([2.0, -1.0, 0.0])
    np.testing.assert_allclose(earth[face == 4, 2], -5.0, atol=1e-12)
    assert heading == pytest.approx(65.0)
    np.testing.assert_allclose(rotated(level, a + b) + earth_origin, earth, atol=1e-12)
    under = wet & (earth[:, 2] <= 0)
    level = np.column_stack([velocity[:, 0], -velocity[:, 2], velocity[:, 1]])
    want = SEA.velocity(earth[under], 1.0)
    np.testing.assert_allclose(rotated(level, a + b)[under], want, atol=1e-12)
    volume = np.einsum("pd,pd->p", there, normals) @ area / 3
    assert volume == pytest.approx(8.0 * 6.0 * 6.5, rel=1e-12)


def rotated(vectors, angle):
    cos, sin = math.cos(angle), math.sin(angle)
    x, y, z = vectors.T
    return np.column_stack([cos * x - sin * y, sin * x + cos * y, z])


def test_the_starting_volume_fills_the_box_once(tmp_path):
    deliver(tmp_path, BOX | {"volume_at_start": True, "start": 1.0, "every": "auto"})
    with netCDF4.Dataset(tmp_path / "box-start.nc") as file:
        assert file["time"][:].tolist() == [1.0]
        x, z = file["x"][:], file["z"][:]
        assert (x.min(), x.max(), z.min(), z.max()) == (-1.0, 5.0, -4.75, 1.25)
        assert len(x) == 4 * 3 * 13
    with netCDF4.Dataset(tmp_path / "box.nc") as file:
        step = np.diff(file["time"][:])
        assert step.max() <= PERIOD / 40 * (1 + 1e-9)
        assert (file["time"][0], file["time"][-1]) == (1.0, 4.0)


def test_round_a_hull_the_volume_is_dry_inside_and_wet_below(tmp_path):
    buoy = place_hull("buoy", forms.cylinder(1.2, 2.0, 0.4), position=(2.0, -1.0))
    deliver(tmp_path, BOX | {"spacing": 0.5, "volume_at_start": True}, hulls=[buoy])
    with netCDF4.Dataset(tmp_path / "box-start.nc") as file:
        x, y, z = (file[n][:].data for n in "xyz")
        radius, wet = np.hypot(x - 2.0, y + 1.0), file["wet"][0].data
        inner = radius < 1.1
        assert not wet[inner & (z > -1.9)].any()
        assert np.all(wet[inner & (z < -2.1)] == 1.0)
        assert np.all(wet[(radius > 1.3) & (z < -0.75)] == 1.0)
        column = np.hypot(file["column_x"][:] - 2.0, file["column_y"][:] + 1.0)
        gone = np.ma.getmaskarray(file["elevation"][0])
        assert gone[column < 1.1].all()
        assert not gone[column > 1.3].any()
    with netCDF4.Dataset(tmp_path / "box.nc") as file:
        # the sea flows through a hull that is not solved for: its waterplane is what is missing
        left = (file["net_flux"][:] + file["volume_rate"][:]).data
        at = np.column_stack([*buoy.polygons()[0].mean(axis=0)[None].T, [0.0]])
        through = -SEA.velocity(at, file["time"][:].data)[:, 0, 2] * math.pi * 1.2**2
        np.testing.assert_allclose(left, through, atol=0.05 * np.abs(through).max())
    alone = deliver(tmp_path / "b", BOX | {"spacing": 0.5, "field": "incident"}, hulls=[buoy])[1]
    with netCDF4.Dataset(alone) as file:
        left = (file["net_flux"][:] + file["volume_rate"][:]).data
        assert np.abs(left).max() < 0.005 * file["largest_face_flux"][:].max()


def test_a_list_of_points_keeps_its_order(tmp_path):
    listed = tmp_path / "cells.csv"
    listed.write_text("x,y,z\n1.5,2,-3\n0,0,0.2\n1.5,2,-1\n")
    path = deliver(tmp_path, {"points": str(listed), "every": 1.0})[1]
    with netCDF4.Dataset(path) as file:
        assert file["x"][:].tolist() == [1.5, 0.0, 1.5]
        assert file["z"][:].tolist() == [-3.0, 0.2, -1.0]
        assert len(file.dimensions["column"]) == 2
        assert "net_flux" not in file.variables


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("a,b,c\n1,2,3\n", "line 1: got 'a,b,c', expected the header x,y,z"),
        ("x,y,z\n1,2\n", "line 2: got '1,2', expected three numbers"),
        ("x,y,z\n", "holds 0 points"),
        ("x,y,z\n1,2,nan\n", "not all of them numbers"),
        ("x,y,z\n100,2,-1\n", "outside the useful water"),
        ("x,y,z\n1,2,-21\n", "below the bed"),
    ],
)
def test_a_bad_list_of_points_is_answered(tmp_path, text, words):
    listed = tmp_path / "cells.csv"
    listed.write_text(text)
    with pytest.raises(InputError, match=words.replace("(", "\\(")):
        deliver(tmp_path, {"points": str(listed)})


def test_xarray_reads_the_same_numbers(tmp_path):
    path = deliver(tmp_path, BOX)[1]
    with netCDF4.Dataset(path) as file, xarray.open_dataset(path) as opened:
        assert opened["time"].dtype == np.float64
        for name in file.variables:
            raw = np.ma.filled(file[name][:], np.nan if file[name].dtype.kind == "f" else 0)
            np.testing.assert_array_equal(opened[name].values, raw)
            assert opened[name].attrs["units"] == file[name].units


def test_an_interrupted_handoff_goes_on_to_the_same_file(tmp_path):
    whole = deliver(tmp_path / "whole", BOX)[1]
    deliver(tmp_path / "cut", BOX, stop=6)
    resumed = deliver(tmp_path / "cut", BOX, keep=4)[1]
    with netCDF4.Dataset(whole) as a, netCDF4.Dataset(resumed) as b:
        for name in a.variables:
            np.testing.assert_array_equal(a[name][:], b[name][:])


def test_more_records_than_there_are_cannot_be_kept(tmp_path):
    deliver(tmp_path, BOX, stop=3)
    with pytest.raises(RunError, match="holds 3 complete records; the checkpoint was made after 5"):
        deliver(tmp_path, BOX, keep=5)


WRITER = """
import sys
from pathlib import Path
import numpy as np
from bemwave.handoff.netcdf import Layout, SeriesFile, Variable
made = [Variable(n, ("time", "point"), "1", "value") for n in "abcd"]
times = 0.25 * np.arange(20_000)
out = SeriesFile(Path(sys.argv[1]), Layout({"point": 20}, [], made, {}, times))
rng = np.random.default_rng(1)
while True:
    time = out.count * 0.25
    out.append(time, {n: rng.normal(size=20) + 100 * time for n in "abcd"})
    if out.count == 16:
        print("ready", flush=True)
"""


def test_a_file_whose_writer_is_killed_stays_readable(tmp_path):
    rng = np.random.default_rng(5)
    for trial in range(6):
        path = tmp_path / f"{trial}.nc"
        writer = subprocess.Popen([sys.executable, "-c", WRITER, str(path)], stdout=subprocess.PIPE)
        with writer:
            writer.stdout.readline()
            try:
                writer.wait(rng.uniform(0.0, 0.3))
            except subprocess.TimeoutExpired:
                writer.send_signal(signal.SIGKILL)
        with netCDF4.Dataset(path) as file:
            times = read_times(file)
            assert len(times) >= 16
            np.testing.assert_array_equal(times, 0.25 * np.arange(len(times)))
            for name in "abcd":
                values = np.ma.filled(file[name][: len(times)], np.nan)
                assert np.abs(values.mean(axis=1) - 100 * times).max() < 2.0, name


def test_records_become_readable_a_few_at_a_time(tmp_path):
    path = tmp_path / "flow.nc"
    rate = Variable("flow", ("time",), "m3 s-1", "flow")
    times = np.arange(RECORDS_PER_WRITE + 1.0)
    out = SeriesFile(path, Layout({}, [], [rate], {}, times))
    for k in range(RECORDS_PER_WRITE):
        out.append(float(k), {"flow": k})
    with netCDF4.Dataset(path) as file:
        assert complete_records(file) == RECORDS_PER_WRITE
    with pytest.raises(ValueError, match=r"takes 8\.0 s next: got 99\.0"):
        out.append(99.0, {"flow": 1.0})
    out.append(8.0, {"flow": 1.0})
    out.close()
    with netCDF4.Dataset(path) as file:
        assert read_times(file)[-1] == 8.0
    with pytest.raises(ValueError, match="takes \\['flow'\\]: got \\['level'\\]"):
        out.append(100.0, {"level": 1.0})


def test_auto_instants_are_forty_or_a_few_more_in_the_shortest_period():
    case = Case(
        water={"depth": 20.0},
        surface={"size": [40.0, 40.0], "spacing": 2.0},
        run={"duration": 10.0},
        handoff=[{"box": {"size": [4.0, 4.0], "bottom": -2.0, "top": 1.0}, "start": 3.0}],
    )
    times = instants(case.handoff[0], 2.0)
    # check-values 18: 20-40 instants or more in the shortest period (common practice, no source)
    assert len(times) == 141
    assert (times[0], times[-1]) == (3.0, 10.0)
