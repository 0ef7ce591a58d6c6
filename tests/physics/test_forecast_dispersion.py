"""Frequencies of waves on panels against the scheme's forecast of its own error.

Standing waves between four mirrors are the eigenvectors of the flow map, so that panels on the
water alone err. Source of the exact frequencies: w^2 = g k tanh kh (Lamb, Hydrodynamics, art. 190,
257); of the forecast: `flow.dispersion`, a closed form that knows no matrix. A standing wave is
made of waves of headings +- and its error is their mean; mirrors turn the diagonals of the
squares, which the forecast does not know and which fades as the tank grows.
"""

import math
from itertools import product

import numpy as np
import pytest
from scipy import linalg

from bemwave.errors import InputError
from bemwave.flow.dispersion import frequency_error, phase_error
from bemwave.flow.images import Mirror
from bemwave.flow.panels import PanelFlow
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.water_surface import water_surface
from bemwave.waves.dispersion import group_speed, phase_speed, wavenumber

ZETA_3 = 1.2020569


def standing_wave_errors(cells, depth, closed, structured, shortest, longest):
    """Measured and forecast d(w)/w of all modes within a range of lengths; panels of size 1."""
    sides = [float(n) for n in cells]
    sheet = water_surface(Rectangle(0.0, sides[0], 0.0, sides[1]), 1.0, structured=structured)
    walls = tuple(Mirror(a, p) for a, end in zip("xy", sides, strict=True) for p in (0.0, end))
    flow = PanelFlow(sheet, depth, closed=closed, mirrors=walls)
    squares, modes = linalg.eigh(flow.surface_matrix, flow.mass.toarray())
    x, y = flow.elements.points[: flow.elements.free, :2].T
    pairs = []
    for m in product(range(cells[0]), range(cells[1])):
        kx, ky = (math.pi * n / side for n, side in zip(m, sides, strict=True))
        k, heading = math.hypot(kx, ky), math.atan2(ky, kx)
        along_a_wall = 0 in m and math.isinf(depth)  # the cut-off of the images shows in these
        if along_a_wall or not shortest < 2 * math.pi / max(k, 1e-9) < longest:
            continue
        # the mode most like the wave; interpolation tells modes apart well enough
        likeness = np.abs(modes.T @ (flow.mass @ (np.cos(kx * x) * np.cos(ky * y))))
        square = squares[np.argmax(likeness)]
        measured = math.sqrt(square / (k * math.tanh(k * depth))) - 1
        both = [
            frequency_error(
                2 * math.pi / k, 1.0, depth, closed=closed, structured=structured, heading=h
            )
            for h in (heading, -heading)
        ]
        pairs.append((measured, sum(both) / 2))
    assert len(pairs) >= 3
    return np.array(pairs).T


@pytest.mark.parametrize(("cells", "shortest", "longest"), [((12, 10), 5.3, 7), ((14, 12), 7, 9)])
def test_open_sheet_of_squares(cells, shortest, longest):
    measured, forecast = standing_wave_errors(cells, math.inf, False, True, shortest, longest)
    np.testing.assert_allclose(measured, forecast, rtol=0.2)


@pytest.mark.parametrize(("cells", "shortest", "longest"), [((12, 10), 5.3, 7), ((14, 12), 7, 9)])
def test_open_sheet_of_meshed_triangles(cells, shortest, longest, needs_gmsh):
    measured, forecast = standing_wave_errors(cells, math.inf, False, False, shortest, longest)
    np.testing.assert_allclose(measured, forecast, rtol=0.2)


@pytest.mark.parametrize("structured", [True, False])
def test_image_walls_and_bed(structured, request):
    """The mean of the modes; one by one they differ by up to a third with the mesh at the walls."""
    if not structured:
        request.getfixturevalue("needs_gmsh")
    measured, forecast = standing_wave_errors((16, 14), 3.0, True, structured, 5.0, 6.6)
    assert measured.mean() == pytest.approx(forecast.mean(), rel=0.2)
    np.testing.assert_allclose(measured, forecast, rtol=0.35)


@pytest.mark.slow
def test_image_walls_and_bed_of_a_wide_tank_of_squares():
    """The diagonals turned by the mirrors count for less: a tenth, where above it is a seventh."""
    measured, forecast = standing_wave_errors((24, 20), 3.0, True, True, 5.2, 6.6)
    assert measured.mean() == pytest.approx(forecast.mean(), rel=0.12)


@pytest.mark.parametrize("kh", [math.inf, 1.0])
def test_long_waves_along_a_side_err_by_the_first_harmonics(kh):
    """The sum over m of 2 pi |m|/d sinc^4 begins with zeta(3) (d/L)^3/tanh kh."""
    length = 60.0
    expected = ZETA_3 / length**3 / math.tanh(kh)
    found = frequency_error(length, 1.0, kh * length / (2 * math.pi), heading=0.0)
    assert found == pytest.approx(expected, rel=0.03)


@pytest.mark.parametrize("structured", [True, False])
def test_the_open_error_falls_with_the_cube_of_panel_size(structured):
    coarse, fine = (frequency_error(n, 1.0, structured=structured) for n in (8.0, 16.0))
    assert math.log2(coarse / fine) == pytest.approx(3.0, abs=0.1)


def test_squares_look_alike_from_both_ends_and_across_their_diagonal():
    one, back, across = (
        frequency_error(7.0, 1.0, 2.0, closed=True, heading=math.radians(h))
        for h in (20.0, 200.0, 70.0)
    )
    assert back == pytest.approx(one, rel=1e-6)
    assert across == pytest.approx(one, rel=1e-6)


def test_the_worst_heading_is_the_default():
    found = [abs(frequency_error(7.0, 1.0, heading=h)) for h in np.linspace(0, math.pi, 9)]
    assert abs(frequency_error(7.0, 1.0)) >= max(found) - 1e-12


def test_phase_error_is_that_of_the_wavenumber_at_one_frequency():
    """Against the wavenumber of a scheme whose frequencies are all high by the same share."""
    period, depth = 8.0, 20.0
    k = float(wavenumber(period, depth))
    length = 2 * math.pi / k
    share = frequency_error(length, 6.0, depth)
    shifted = float(wavenumber(period * (1 + share), depth))
    expected = (k - shifted) * 300.0
    assert phase_error(length, 6.0, 300.0, depth) == pytest.approx(expected, rel=0.01)
    ratio = float(phase_speed(period, depth) / group_speed(period, depth))
    assert phase_error(length, 6.0, 300.0, depth) == pytest.approx(k * 300 * ratio * share)


def test_waves_shorter_than_two_panels_are_refused():
    with pytest.raises(InputError, match=r"spacing of 2 m .* waves 3 m long.* 0\.5 m or less"):
        frequency_error(3.0, 2.0)
