import math

import netCDF4
import numpy as np
import pytest
import xarray

from bemwave.flow.state import ARRAYS, SurfaceState
from bemwave.records import BodiesFile, GaugesFile, History, HistoryFile

W = 1.3
# one standing wave at each place: a value, its rate, the rate's rate
SHIFT = {"node": np.linspace(0, 3, 5), "hull_node": np.array([0.4, 1.0]), "hull_panel": np.ones(3)}
PLACES = {
    "elevation": ("node", 0),
    "surface_flux": ("node", 1),
    "surface_flux_rate": ("node", 2),
    "potential": ("node", 0),
    "potential_rate": ("node", 1),
    "hull_potential": ("hull_node", 0),
    "hull_potential_rate": ("hull_node", 1),
    "hull_flux": ("hull_panel", 0),
    "hull_flux_rate": ("hull_panel", 1),
}


def state_at(time):
    fields = {}
    for name, (place, order) in PLACES.items():
        fields[name] = W**order * np.cos(W * time + SHIFT[place] + order * math.pi / 2)
    return SurfaceState(time, **fields)


def written(tmp_path, times):
    path = tmp_path / "history.nc"
    out = HistoryFile(path, times, np.zeros((5, 3)), np.zeros((2, 3)), np.zeros((3, 3)))
    for time in times:
        out.add(state_at(time))
    out.flush()
    return path


def test_the_places_cover_the_state():
    assert set(PLACES) == set(ARRAYS)


def test_records_come_back_in_single_precision(tmp_path):
    times = np.arange(20) * 0.3
    path = written(tmp_path, times)
    history = History(path)
    np.testing.assert_array_equal(history.times, times)
    for k in (0, 7, 19):
        state = history.record(k)
        assert state.time == times[k]
        for name in ARRAYS:
            exact = getattr(state_at(times[k]), name)
            np.testing.assert_array_equal(getattr(state, name), exact.astype(np.float32))
    with netCDF4.Dataset(path) as file:
        assert file["elevation"].dtype == np.float32
        assert file["elevation"].dimensions == ("time", "node")
        assert all(v.units for v in file.variables.values())
    with xarray.open_dataset(path) as opened:
        exact = state_at(times[4]).potential.astype(np.float32)
        np.testing.assert_array_equal(opened["potential"][4].values, exact)


def test_between_records_the_error_is_as_stated_and_of_fourth_order(tmp_path):
    errors = []
    for step in (0.6, 0.3):
        folder = tmp_path / str(step)
        folder.mkdir()
        history = History(written(folder, np.arange(12) * step))
        middle = history.at(5.5 * step)
        exact = state_at(5.5 * step)
        # numerics.md, Hand-off: Hermite errs by (w dt)^4/384
        worst = max(
            np.abs(getattr(middle, n) - getattr(exact, n)).max() / W ** PLACES[n][1]
            for n in ("elevation", "potential", "surface_flux", "hull_potential", "hull_flux")
        )
        assert worst < (W * step) ** 4 / 384 * 1.05
        assert worst > (W * step) ** 4 / 384 * 0.5
        errors.append(worst)
        for name in ("potential_rate", "surface_flux_rate"):
            error = np.abs(getattr(middle, name) - getattr(exact, name)).max()
            assert error < 3 / 128 * (W * step) ** 4 * W ** PLACES[name][1] * 1.05
    assert 3.8 < math.log2(errors[0] / errors[1]) < 4.2


def test_at_the_ends_and_with_few_records_it_still_interpolates(tmp_path):
    history = History(written(tmp_path, np.arange(2) * 0.1))
    np.testing.assert_allclose(history.at(0.05).elevation, state_at(0.05).elevation, atol=2e-6)
    np.testing.assert_array_equal(history.at(0.1).elevation, history.record(1).elevation)
    with pytest.raises(ValueError, match=r"the record runs from 0 to 0\.1 s"):
        history.at(0.2)


def test_bodies_have_names_and_degrees(tmp_path):
    path = tmp_path / "bodies.nc"
    out = BodiesFile(path, [0.5], ["tender", "rig"])
    motion = np.zeros((2, 6))
    motion[1] = [1, 2, 3, 0.1, 0.2, math.pi]
    out.add(0.5, motion, 2 * motion, {"force": 10 * motion})
    out.flush()
    with netCDF4.Dataset(path) as file:
        assert list(file["body"][:]) == ["tender", "rig"]
        assert list(file["mode"][:]) == ["surge", "sway", "heave", "roll", "pitch", "yaw"]
        assert file["motion"].dimensions == ("time", "body", "mode")
        want = [1, 2, 3, math.degrees(0.1), math.degrees(0.2), 180.0]
        np.testing.assert_allclose(file["motion"][0, 1], want, rtol=1e-15)
        np.testing.assert_allclose(file["velocity"][0, 1], 2 * np.array(want), rtol=1e-15)
        np.testing.assert_array_equal(file["force"][0], 10 * motion)
        assert np.ma.getmaskarray(file["force_radiated"][0]).all()
        assert "not for design" in file.caution.lower()
        assert all(v.units for v in file.variables.values())
    with xarray.open_dataset(path) as opened:
        assert opened["force"].sel(body="rig", mode="heave").item() == 30.0
    with pytest.raises(ValueError, match="lift"):
        out.add(1.0, motion, motion, {"lift": motion})


def test_gauges_have_names_and_gaps(tmp_path):
    path = tmp_path / "gauges.nc"
    out = GaugesFile(path, [0.0], ["bow", "inside"], [[1, 2], [3, 4]], [4.0, np.nan])
    out.add(0.0, [0.25, np.nan], [0.5, 0.125])
    out.flush()
    with netCDF4.Dataset(path) as file:
        assert list(file["name"][:]) == ["bow", "inside"]
        assert file["elevation"].dimensions == ("time", "gauge")
        assert file["gap"][0].filled(np.nan)[0] == 3.75
        assert np.ma.getmaskarray(file["gap"][0]).tolist() == [False, True]
        assert np.ma.getmaskarray(file["elevation"][0]).tolist() == [False, True]
        assert file["incident_elevation"][0].tolist() == [0.5, 0.125]
        assert file["x"][:].tolist() == [1.0, 3.0]
