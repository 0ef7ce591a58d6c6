"""Route "grid": free waves of open water, in time.

The scheme has no dispersion of its own and is exact in time: a wave train keeps its phase and its
height, and a mound let go spreads as the Cauchy-Poisson problem has it (Lamb, Hydrodynamics,
art. 255, in finite depth with k tanh kh for k).
"""

import math

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import j0

from bemwave.flow.exact import LARGEST_TURN
from bemwave.flow.grid import GridFlow
from bemwave.flow.sheet import Sheet
from bemwave.stepping.stepper import STENCIL, Stepper

G = 9.81


@pytest.mark.parametrize("depth", [math.inf, 1.5])
def test_a_wave_train_keeps_phase_and_amplitude_for_1000_periods(depth):
    flow = GridFlow(Sheet(0.0, 0.0, 1.0, (16, 8), depth))
    along = 2 * math.pi * np.array([2 / 16, 1 / 8])
    k = math.hypot(*along)
    w = math.sqrt(G * k * math.tanh(k * depth))
    step = LARGEST_TURN / flow.fastest(G)
    phase = flow.sheet.xy @ along

    # elevation cos(k.x - w t): the potential at each step, and the mean elevation of the last one
    def potential(count):
        return (G / w * np.sin(phase - w * count * step))[:, None]

    stepper, first = Stepper(flow, G, step, []), STENCIL - 1
    mean = np.sinc(0.5 * w * step / math.pi) * np.cos(phase - w * (first - 0.5) * step)
    past = np.array([potential(count) for count in range(STENCIL)])
    kept = {f"potential {n}": potential for n, potential in enumerate(past)}
    stepper.restore({**kept, "mean": mean[:, None]}, first)
    while stepper.time < 1000 * 2 * math.pi / w:
        stepper.advance()
    found = list(stepper.history().values())[-2]
    # amplitude and phase of what is found over what should be
    train = np.exp(1j * phase)
    wave = (train @ found[:, 0]) / (train @ potential(stepper.count)[:, 0])
    assert abs(abs(wave) - 1.0) < 1e-10
    assert abs(np.angle(wave)) < 1e-10
    assert np.abs(found - potential(stepper.count)).max() < 1e-9 * G / w


def elevation(r, time, depth):
    """Of a mound exp(-r^2/2) m at rest at t = 0."""

    def integrand(k):
        turn = math.sqrt(G * k * math.tanh(k * depth)) * time
        return k * math.exp(-k * k / 2) * j0(k * r) * math.cos(turn)

    return quad(integrand, 1e-12, 9.0, limit=400)[0]  # exp(-81/2) is 3e-18


@pytest.mark.parametrize(
    ("place", "values"),
    [((0, 1), (-0.61349607, -0.54988785)), ((10, 8), (-0.06294542, -0.05386094))],
)
def test_the_integral_has_the_digits_of_its_table(place, values):
    found = [elevation(*place, depth) for depth in (math.inf, 2.0)]
    assert found == pytest.approx(values, abs=1e-8)


@pytest.mark.parametrize("depth", [math.inf, 2.0])
def test_a_mound_let_go(depth):
    # on a periodic grid the mound's volume raises the mean level, by 3e-5 m on one this wide
    spacing, half = 0.6, 384
    corner = -half * spacing
    flow = GridFlow(Sheet(corner, corner, spacing, (2 * half, 2 * half), depth))
    mound = np.exp(-0.5 * (flow.sheet.xy**2).sum(axis=1))
    stepper = Stepper(flow, G, 0.5 * LARGEST_TURN / flow.fastest(G), [], elevation=mound)
    out = np.array([0, 2, 3, 8, 17])
    nodes, radii = half * 2 * half + half + out, out * spacing  # along x = 0
    worst = 0.0
    for time in (1.0, 2.0, 4.0, 8.0):
        while not stepper.ready(time):
            stepper.advance()
        found = -stepper.parts_at(time)[1][nodes, 0] / G
        exact = np.array([elevation(r, time, depth) for r in radii])
        worst = max(worst, float(np.abs(found - exact).max()))
    assert worst < 1e-4  # of the peak, 1 m at the start
