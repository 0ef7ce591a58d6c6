"""sea.nc gives back the sea bit for bit."""

import math

import numpy as np
import pytest
import xarray
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from netCDF4 import Dataset

from bemwave.errors import InputError
from bemwave.waves import Sea, make_sea, read_sea, write_sea

ARRAYS = ("frequency", "heading", "amplitude", "phase", "wavenumber")
NUMBERS = ("depth", "density", "gravity", "share")


def assert_same(sea, other):
    for name in ARRAYS:
        assert np.array_equal(getattr(sea, name), getattr(other, name)), name
    for name in NUMBERS:
        assert getattr(sea, name) == getattr(other, name), name


@pytest.mark.parametrize("depth", [40.0, math.inf])
def test_a_made_sea(tmp_path, depth):
    wind = make_sea("jonswap", depth=depth, height=2.0, period=7.0, heading=211.0, spreading=9.0)
    swell = make_sea("group", depth=depth, height=1.0, period=12.0, focus=(7.0, 3.0, 500.0))
    for sea in (wind, wind + swell, wind.mirrored("y", 123.4), Sea.still(depth)):
        write_sea(sea, tmp_path / "sea.nc")
        assert_same(sea, read_sea(tmp_path / "sea.nc"))


angles = st.lists(st.floats(-1000.0, 1000.0), min_size=1, max_size=30)


@settings(max_examples=60, deadline=None, suppress_health_check=[
    HealthCheck.function_scoped_fixture])  # fmt: skip
@given(angles, st.floats(1.0, 1e4))
def test_any_angle(tmp_path, values, depth):
    sea = Sea.of(np.linspace(0.3, 2.0, len(values)), values, 0.1, values[::-1], depth=depth)
    # held as given, to within rounding of a whole turn
    assert np.cos(sea.heading - np.array(values)) == pytest.approx(1.0, abs=1e-15)
    assert np.sin(sea.heading - np.array(values)) == pytest.approx(0.0, abs=5e-13)
    write_sea(sea, tmp_path / "sea.nc")
    assert_same(sea, read_sea(tmp_path / "sea.nc"))


def test_the_file_says_what_it_holds(tmp_path):
    sea = make_sea("jonswap", depth=40.0, height=2.0, period=7.0, heading=30.0)
    write_sea(sea, tmp_path / "sea.nc")
    with Dataset(tmp_path / "sea.nc") as file:
        assert file.Conventions == "CF-1.11"
        assert set(file.dimensions) == {"component"}
        assert all(variable.units and variable.long_name for variable in file.variables.values())
        assert all(variable.dtype == np.float64 for variable in file.variables.values())
        assert file["frequency"].units == "rad s-1"
        assert file["heading"].units == "degree"
    with xarray.open_dataset(tmp_path / "sea.nc") as data:
        assert data["heading"].values == pytest.approx(30.0, rel=1e-15)
        angle = np.radians(data["phase"].values) - 2.0 * data["frequency"].values
        elevation = float(np.sum(data["amplitude"].values * np.cos(angle)))
    assert elevation == pytest.approx(float(sea.elevation(0.0, 0.0, 2.0)), abs=1e-12)


def test_what_is_no_sea_file_is_refused(tmp_path):
    with pytest.raises(InputError, match=r"sea file .*none\.nc cannot be read .*expected one that"):
        read_sea(tmp_path / "none.nc")
    (tmp_path / "text.nc").write_text("no netCDF")
    with pytest.raises(InputError, match="cannot be read"):
        read_sea(tmp_path / "text.nc")
    with Dataset(tmp_path / "other.nc", "w"):
        pass
    with pytest.raises(InputError, match="frequency"):
        read_sea(tmp_path / "other.nc")
