"""Detail that panels cannot carry: its spectrum and motion, shelter behind hulls, looping seas."""

from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import quad

from bemwave.case import Case
from bemwave.errors import InputError
from bemwave.frames import MovingSurface, grid_sheet
from bemwave.frames.shelter import shelter
from bemwave.running.frames_output import moving_surface, note_on, shares
from bemwave.running.sea import added_sea, incident_sea
from bemwave.running.solution import nothing_solved
from bemwave.running.survey import survey
from bemwave.waves import Sea, jonswap, sea_above_band, wavenumber_of_frequency

HEIGHT, PERIOD, DEPTH = 1.5, 6.0, 30.0
PEAK = 2.0 * np.pi / PERIOD
BAND = (0.5, 2.0)
WAVES = {
    "kind": "jonswap", "height": HEIGHT, "period": PERIOD, "heading": 30.0, "spreading": 6.0,
    "components": 300, "band": BAND,
}  # fmt: skip
SURFACE = {"size": [100.0, 80.0], "spacing": 4.0}
REGION = {"size": [200.0, 160.0]}


def case(frames=None, waves=WAVES, **tables):
    frames = {"region": REGION, "spacing": 0.5, "fps": 24.0} | (frames or {})
    least = {"water": {"depth": DEPTH}, "surface": SURFACE, "run": {"duration": 10.0}}
    return Case(waves=[waves], frames=frames, **(least | tables))


def added(up_to=6.0, **keys):
    values = {k: v for k, v in WAVES.items() if k != "kind"} | keys
    return sea_above_band("jonswap", up_to, depth=DEPTH, **values)


def energy(low, high):
    """Of the case's spectrum; by quadrature of check-values' JONSWAP with the exact normaliser."""
    return quad(lambda w: float(jonswap(np.array([w]), HEIGHT, PERIOD, 3.3)[0]), low, high)[0]


def test_the_added_waves_are_the_spectrum_above_its_band_and_nothing_else():
    sea = added()
    assert sea.count == 16000
    # the band ends with the last stratum whose middle it holds: within half a stratum
    assert sea.frequency.min() == pytest.approx(2.0 * PEAK, abs=PEAK * 3.5 / 300)
    assert sea.frequency.max() == pytest.approx(6.0, rel=1e-3)
    for low, high in ((2.05, 2.5), (2.5, 3.5), (3.5, 5.0)):
        held = (sea.frequency >= low * PEAK) & (sea.frequency < high * PEAK)
        want = energy(low * PEAK, high * PEAK)
        assert sea.keep(held).moment(0) == pytest.approx(want, rel=0.005)
    assert np.degrees(sea.mean_heading) == pytest.approx(30.0, abs=0.5)
    again = added()
    np.testing.assert_array_equal(again.phase, sea.phase)
    assert not np.array_equal(added(seed=2).phase, sea.phase)
    for kind in ("regular", "group", "table"):
        assert not sea_above_band(kind, 6.0, depth=DEPTH, height=1.0, period=6.0).count
    assert not added(up_to=1.0).count


def spectrum_of_frame(elevation, step):
    """Variance by wavenumber of a frame (ny, nx), windowed: (wavenumbers, variances)."""
    ny, nx = elevation.shape
    window = np.hanning(ny)[:, None] * np.hanning(nx)
    power = np.abs(np.fft.fft2(elevation * window)) ** 2 / (nx * ny * (window**2).sum())
    k = [2.0 * np.pi * np.fft.fftfreq(n, step) for n in (nx, ny)]
    return np.hypot(k[0][None, :], k[1][:, None]), power


def test_the_spectrum_of_a_frame_is_the_case_s_over_the_added_band():
    whole = case()
    sea = incident_sea(whole, ())
    sheet = grid_sheet((0.0, 0.0), REGION["size"], 0.5)
    frame = MovingSurface(sheet, sea + added_sea(whole, ()), None).at(nothing_solved(3.0))
    k, power = spectrum_of_frame(frame.elevation.reshape(321, 401), 0.5)
    edges = np.array([2.2, 2.8, 4.0]) * PEAK  # clear of the band's end, whose peak leaks
    at = wavenumber_of_frequency(edges, DEPTH, 9.80665)
    both = (k >= at[0]) & (k < at[2])
    assert power[both].sum() == pytest.approx(energy(edges[0], edges[2]), rel=0.05)
    first = (k >= at[0]) & (k < at[1])
    assert power[first].sum() == pytest.approx(energy(edges[0], edges[1]), rel=0.08)  # fewer waves


def test_detail_goes_on_from_frame_to_frame_at_its_own_speed():
    sheet = grid_sheet((0.0, 0.0), (30.0, 20.0), 0.5)
    surface = MovingSurface(sheet, added(), None)
    step = 1.0 / 24.0
    before, now, after = (surface.at(nothing_solved(5.0 + n * step)) for n in (-1, 0, 1))
    rate = (after.elevation - before.elevation) / (2.0 * step)
    error = rate - now.velocity[:, 2]
    assert np.sqrt(np.mean(error**2)) < 0.02 * np.sqrt(np.mean(rate**2))
    exact = added().elevation(*sheet.mesh.points[::97, :2].T, 5.0)
    np.testing.assert_allclose(now.elevation[::97], exact, atol=1e-8)
    np.testing.assert_allclose(
        -now.downward_acceleration[::97],
        added().at(sheet.mesh.points[::97]).acceleration(5.0)[:, 2],
        atol=1e-7,
    )


def test_detail_comes_with_squares_finer_than_the_panels_and_can_be_left_out():
    assert added_sea(case(), ()).count
    assert not added_sea(case({"detail": False}), ()).count
    assert not added_sea(case({"spacing": 4.0}), ()).count
    assert not added_sea(case({"region": None, "spacing": 0.5}), ()).count
    # the shortest wave added has two and a half squares
    shortest = 2.0 * np.pi / added_sea(case({"spacing": 1.0}), ()).wavenumber.max()
    assert shortest == pytest.approx(2.5, rel=1e-2)
    # what is solved with stays as it was
    plain = incident_sea(case({"detail": False}), ())
    np.testing.assert_array_equal(incident_sea(case(), ()).amplitude, plain.amplitude)


def test_the_shares_say_what_is_solved_and_what_is_added():
    surveyed = survey(case())
    said = shares(surveyed)
    top = added_sea(surveyed.case, ()).frequency.max()
    want = energy(2.0 * PEAK, top) / (HEIGHT**2 / 16.0 + energy(2.0 * PEAK, top))
    assert said["frames_share_added"] == pytest.approx(want, rel=0.03)
    assert sum(said.values()) == pytest.approx(1.0)
    assert "never for loads or clearance" in note_on(surveyed)
    assert "only" not in note_on(survey(case({"detail": False})))


def test_a_hull_shelters_short_waves_behind_it_and_nowhere_else():
    square = np.array([[-4.0, -6.0], [4.0, -6.0], [4.0, 6.0], [-4.0, 6.0]])
    sea = added(heading=0.0, spreading=20.0)
    plan = np.array([[-30.0, 0.0], [0.0, 40.0], [5.0, 0.0], [40.0, 0.0], [400.0, 0.0]])
    ahead, abreast, close, behind, far = shelter(plan, [square], sea)
    assert ahead == abreast == 1.0
    assert close < 0.15
    assert close < behind < far
    assert 0.9 < far <= 1.0
    np.testing.assert_array_equal(shelter(plan, [], sea), 1.0)


def test_short_waves_are_faded_behind_hulls_only_where_detail_is_added():
    block = {"name": "block", "form": "box", "length": 12.0, "beam": 12.0, "draught": 6.0}
    still = nothing_solved(2.0)
    plain, fine = (
        survey(case({"detail": on, "region": {"size": [60.0, 40.0]}}, body=[block]))
        for on in (False, True)
    )
    exact = moving_surface(plain, plain.case.frames, None).at(still)
    x, y = exact.mesh.points[:, :2].T
    np.testing.assert_allclose(exact.elevation, plain.sea.elevation(x, y, 2.0), atol=1e-8)
    drawn = moving_surface(fine, fine.case.frames, None).at(still)
    long = fine.scattered.elevation(x, y, 2.0)
    lee = (x * np.cos(np.pi / 6) + y * np.sin(np.pi / 6) > 6.5) & (np.hypot(x, y) < 9.0)
    away = np.hypot(x, y) > 25.0
    short = drawn.elevation - long
    skirt = drawn.under_hull & (x * np.cos(np.pi / 6) + y * np.sin(np.pi / 6) > 5.0)
    assert skirt.sum() > 20
    assert short[skirt].std() < 0.5 * short[away].std()  # no step at the waterline
    assert short[lee].std() < 0.5 * short[away].std()


def test_a_looping_sea_is_the_same_after_its_loop():
    looped = case({"loop": 20.0})
    for sea in (incident_sea(looped, ()), added_sea(looped, ())):
        assert sea.count
        x, y = np.array([0.0, 13.0, -8.0]), np.array([0.0, 5.0, 21.0])
        start = sea.elevation(x, y, 3.0)
        np.testing.assert_allclose(sea.elevation(x, y, 23.0), start, atol=1e-9)
        assert np.abs(sea.elevation(x, y, 13.0) - start).max() > 0.01
        again = wavenumber_of_frequency(sea.frequency, DEPTH, 9.80665)
        np.testing.assert_allclose(sea.wavenumber, again)
    assert incident_sea(looped, ()).significant_height == pytest.approx(HEIGHT)


def test_a_loop_of_fewer_than_three_energy_periods_is_refused():
    # the energy period 2 pi m(-1)/m(0) of the case's spectrum over its band, by quadrature
    w = np.linspace(0.5 * PEAK, 2.0 * PEAK, 4001)
    density = jonswap(w, HEIGHT, PERIOD, 3.3)
    period = 2.0 * np.pi * np.trapezoid(density / w, w) / np.trapezoid(density, w)
    assert incident_sea(case({"loop": 3.03 * period}), ()).count > 100
    with pytest.raises(InputError, match=r"loop = 16.* expected at least 3 of them, 16.7 s"):
        incident_sea(case({"loop": 2.97 * period}), ())
    regular = {"kind": "regular", "height": 0.5, "period": 5.0}
    assert incident_sea(case({"loop": 15.1}, waves=regular), ()).count == 1
    with pytest.raises(InputError, match=r"waves of 5 s"):
        incident_sea(case({"loop": 14.9}, waves=regular), ())


def test_a_sea_of_one_slow_wave_still_moves_in_a_short_loop():
    slow = Sea.of([0.1], [0.0], [1.0], [0.0], depth=20.0).looped(10.0)
    assert slow.frequency[0] == pytest.approx(2.0 * np.pi / 10.0)


def test_a_run_writes_the_shares_into_its_manifest(tmp_path: Path):
    import bemwave

    small = case({"region": {"size": [20.0, 10.0]}, "end": 0.0, "formats": ["ply"]})
    run = bemwave.run(small, tmp_path / "out")
    notes = run.manifest.notes
    assert notes["frames_share_added"] == pytest.approx(shares(survey(small))["frames_share_added"])
    assert "for pictures only" in notes["frames"]
    header = (tmp_path / "out/frames/surface_00001.ply").read_bytes()[:600]
    assert b"for pictures only, never for loads or clearance" in header
