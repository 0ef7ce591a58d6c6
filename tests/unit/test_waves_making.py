"""make_sea: kinds, tables, and what it refuses."""

import math
import subprocess
import sys

import numpy as np
import pytest

from bemwave.errors import InputError
from bemwave.waves import make_sea, spreading_density, wavenumber

WATER = {"depth": 30.0}


def table(folder, *lines):
    path = folder / "sea.csv"
    path.write_text("\n".join(lines) + "\n")
    return path


def test_regular_wave():
    sea = make_sea("regular", height=2.0, period=8.0, heading=90.0, phase=60.0, **WATER)
    assert sea.count == 1
    assert sea.wavenumber[0] == wavenumber(8.0, 30.0)
    # height/2 cos(k.x - w t + phase)
    y, t = 17.0, 3.0
    angle = sea.wavenumber[0] * y - 2 * math.pi / 8.0 * t + math.pi / 3
    assert sea.elevation(5.0, y, t) == pytest.approx(math.cos(angle), rel=1e-12)
    assert sea.repeat_time == pytest.approx(8.0)


def test_the_default_band_holds_the_number_of_components():
    for count in (1, 7, 250, 1000, 3001):
        sea = make_sea("jonswap", height=2.0, period=8.0, components=count, **WATER)
        assert sea.count == count


def test_entries_of_one_seed_are_different_seas():
    first, second = (
        make_sea("jonswap", height=2.0, period=8.0, stream=stream, **WATER) for stream in (0, 1)
    )
    assert not np.isin(first.frequency, second.frequency).any()
    assert not np.isin(first.phase, second.phase).any()


SPECTRUM = [
    "frequency_rad_s,density_m2s",
    "0.4,0.0",
    "0.6,2.0",
    "0.9,0.5",
    "2.0,0.0",
]


def test_table_of_a_spectrum(tmp_path):
    """The trapezoids' area is its m0; nothing of it is lost."""
    sea = make_sea("table", file=table(tmp_path, *SPECTRUM), heading=40.0, spreading=12.0, **WATER)
    area = 0.2 * 2.0 / 2 + 0.3 * 2.5 / 2 + 1.1 * 0.5 / 2
    assert sea.moment(0) == pytest.approx(area, rel=1e-12)
    assert sea.share == pytest.approx(1.0, rel=1e-12)
    assert math.degrees(sea.mean_heading) == pytest.approx(40.0, abs=1.0)
    stratum = 3.5 * 0.6 / 1000
    assert sea.frequency.min() == pytest.approx(0.4, abs=stratum)
    assert sea.frequency.max() == pytest.approx(2.0, abs=stratum)
    inner = sea.keep((sea.frequency > 0.6) & (sea.frequency < 0.9)).moment(0)
    assert inner == pytest.approx(0.3 * 2.5 / 2, rel=0.01)


def test_table_rescaled_and_cut(tmp_path):
    path = table(tmp_path, *SPECTRUM)
    sea = make_sea("table", file=path, height=3.0, band=(0.5, 1.5), **WATER)
    assert sea.significant_height == pytest.approx(3.0, rel=1e-12)
    assert sea.frequency.max() < 0.9 + 1e-2
    # the share of the two lower trapezoids
    assert sea.share == pytest.approx(0.575 / 0.85, rel=0.01)
    # a peak period tells what the band counts in
    other = make_sea("table", file=path, period=2 * math.pi / 0.9, band=(0.5, 1.5), **WATER)
    assert other.frequency.max() == pytest.approx(1.35, abs=0.01)


def test_table_of_directions(tmp_path):
    headings = np.arange(0, 360, 10)
    lines = ["frequency_rad_s,heading_deg,density_m2s_per_rad"]
    for w, density, mean in (
        (0.5, 0.0, 100.0),
        (0.7, 1.0, 100.0),
        (1.0, 1.0, 100.0),
        (1.3, 0, 100),
    ):
        for b in headings:
            angle = math.remainder(math.radians(b - mean), 2 * math.pi)
            lines.append(f"{w},{b},{density * float(spreading_density(angle, 10.0))!r}")
    sea = make_sea("table", file=table(tmp_path, *lines), **WATER)
    assert sea.moment(0) == pytest.approx(0.1 + 0.3 + 0.15, rel=1e-6)
    assert math.degrees(sea.mean_heading) == pytest.approx(100.0, abs=1.0)
    # a1 = s/(s+1); linear between headings 10 degrees apart widens it by a percent or so
    assert sea.spread == pytest.approx(math.sqrt(2 / 11), rel=0.03)


def test_table_of_directions_that_turn_with_frequency_and_stop(tmp_path):
    """Two narrow sectors: low frequencies go round 10 degrees, high ones round 90."""
    lines = ["frequency_rad_s,heading_deg,density_m2s_per_rad"]
    for w, heading in ((0.5, 10), (0.8, 10), (0.81, 90), (1.2, 90)):
        lines += [f"{w},{b},{1.0 if b == heading else 0.0}" for b in (-10, 10, 30, 70, 90, 110)]
    sea = make_sea("table", file=table(tmp_path, *lines), **WATER)
    degrees = np.degrees(sea.heading)
    low, high = degrees[sea.frequency < 0.8], degrees[sea.frequency > 0.81]
    assert low.mean() == pytest.approx(10.0, abs=0.5)
    assert high.mean() == pytest.approx(90.0, abs=0.5)
    assert low.min() >= -10
    assert low.max() <= 30
    # a triangle of half width 20 degrees
    assert low.std() == pytest.approx(20 / math.sqrt(6), rel=0.02)


def test_table_of_plane_waves(tmp_path):
    header = "frequency_rad_s,heading_deg,amplitude_m,phase_deg"
    path = table(tmp_path, header, "0.8,30,1.5,45", "1.2,-60,0.5,0")
    sea = make_sea("table", file=path, **WATER)
    expected = 1.5 * math.cos(math.radians(45) - 0.8 * 2) + 0.5 * math.cos(1.2 * 2)
    assert sea.elevation(0.0, 0.0, 2.0) == pytest.approx(expected, rel=1e-13)
    assert np.degrees(sea.heading) == pytest.approx([30, -60])
    kept = make_sea("table", file=path, band=(0.5, 1.2), **WATER)
    assert kept.count == 1
    assert kept.share == pytest.approx(1.5**2 / (1.5**2 + 0.5**2))
    with pytest.raises(InputError, match=r"band 3 to 4 .* holds no wave of the table .*sea\.csv"):
        make_sea("table", file=path, band=(3.0, 4.0), **WATER)
    twice = make_sea("table", file=path, height=2 * sea.significant_height, **WATER)
    assert twice.amplitude == pytest.approx([3.0, 1.0])


REFUSED = [
    ({"kind": "swell"}, "wave kind 'swell' is not known; expected one of regular, jonswap"),
    ({"height": None}, "`height` was not given; expected a number above zero"),
    ({"period": -8.0}, "`period` was given as -8; expected a number above zero"),
    ({"height": math.nan}, "`height` was given as nan"),
    ({"components": 0}, "`components` was given as 0; expected 1 or more"),
    ({"spreading": -1.0}, "`spreading` was given as -1; expected 0 or more"),
    ({"band": (4.0, 0.5)}, r"`band` was given as \[4.0, 0.5\]; expected \[low, high\]"),
    ({"band": (1.0, 1.001)}, "narrower than one of the 1000 components' strata"),
    ({"band": (0.01, 0.1)}, "holds no energy of the spectrum; .* widen `band`"),
    ({"seed": -1}, "seed was given as -1"),
    ({"depth": -30.0}, "depth of a wave was given as -30"),
    ({"kind": "group", "spectrum": "round"}, "spectrum of a wave group was given as 'round'"),
    ({"kind": "table"}, "a wave of kind 'table' has no `file`"),
]


@pytest.mark.parametrize(("change", "words"), REFUSED)
def test_what_is_refused(change, words):
    good = {"kind": "jonswap", "height": 2.0, "period": 8.0, **WATER}
    make_sea(**good)
    with pytest.raises(InputError, match=words):
        make_sea(**(good | change))


FAULTY_TABLES = [
    (
        ["w,S", "1,2"],
        r"sea\.csv has the header 'w,S'; expected one of: frequency_rad_s,density_m2s",
    ),
    ([""], "has the header ''"),
    (SPECTRUM[:1], "has no rows under its header"),
    ([*SPECTRUM, "2.2,x"], r"line 6 of the wave table .* reads '2.2,x'; expected 2 numbers"),
    ([*SPECTRUM, "2.2"], "line 6 .* reads '2.2'; expected 2 numbers"),
    ([*SPECTRUM, "-1,0"], "the first a frequency not below zero"),
    ([*SPECTRUM, "nan,0"], "expected 2 numbers"),
    ([*SPECTRUM, "0.6,1"], "expected two or more different frequencies"),
    ([*SPECTRUM, "2.5,-1"], "densities not below zero"),
    (
        ["frequency_rad_s,heading_deg,density_m2s_per_rad", "1,0,1", "1,90,1", "2,0,1"],
        "3 rows for 2 frequencies and 2 headings; expected every heading once",
    ),
    (
        ["frequency_rad_s,heading_deg,amplitude_m,phase_deg", "0,0,1,0"],
        "a frequency of zero or a negative amplitude",
    ),
]


@pytest.mark.parametrize(("lines", "words"), FAULTY_TABLES)
def test_faulty_tables(tmp_path, lines, words):
    with pytest.raises(InputError, match=words):
        make_sea("table", file=table(tmp_path, *lines), **WATER)


def test_a_missing_table(tmp_path):
    with pytest.raises(InputError, match=r"none\.csv cannot be read .*; expected a csv file"):
        make_sea("table", file=tmp_path / "none.csv", **WATER)


def test_import_brings_no_heavy_library():
    code = "import sys, bemwave.waves; print({'scipy', 'netCDF4', 'numba'} & sys.modules.keys())"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "set()"
