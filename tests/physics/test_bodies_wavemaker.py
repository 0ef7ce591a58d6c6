"""Wavemakers in a flume: height of the waves far from them over their stroke, and their power.

Havelock (1929), Phil. Mag. 8, 569-576; Dean & Dalrymple (1991), Water Wave Mechanics for
Engineers and Scientists, ch. 6: for a piston 2 (cosh 2kh - 1)/(sinh 2kh + 2kh), for a flap hinged
at the bed 4 sinh kh (kh sinh kh - cosh kh + 1)/(kh (sinh 2kh + 2kh)). The power is what waves of
that height carry off.
"""

import math

import numpy as np
import pytest

from bemwave.case import Case
from bemwave.running.solution import Solution
from bemwave.running.survey import survey
from bemwave.waves import group_speed

G, DENSITY, STROKE = 9.81, 1000.0, 0.02


def height_over_stroke(kind, kh):
    below = math.sinh(2 * kh) + 2 * kh
    if kind == "piston":
        return 2 * (math.cosh(2 * kh) - 1) / below
    return 4 * math.sinh(kh) * (kh * math.sinh(kh) - math.cosh(kh) + 1) / (kh * below)


@pytest.mark.parametrize(
    ("kind", "values"),
    [
        ("piston", (0.49933830, 0.98178931, 1.68157894, 1.93262323)),
        ("flap", (0.25474376, 0.52808762, 1.04123859, 1.34951971)),
    ],
)
def test_the_formulas_have_the_digits_of_their_table(kind, values):
    found = [height_over_stroke(kind, kh) for kh in (0.5, 1.0, 2.0, 3.0)]
    assert found == pytest.approx(values, abs=1e-8)


@pytest.mark.parametrize("kh", [0.5, 1.0, 2.0, 3.0])
@pytest.mark.parametrize("kind", ["piston", "flap"])
def test_wave_height_and_power(kind, kh):
    """Depth 1, a flume of five cells across with meshed walls, 16 cells a wavelength."""
    wavelength, frequency = 2 * math.pi / kh, math.sqrt(G * kh * math.tanh(kh))
    period, cell = 2 * math.pi / frequency, 2 * math.pi / kh / 16
    length, width = 24 * cell, 5 * cell
    case = Case(
        water={"depth": 1.0, "gravity": G, "density": DENSITY},
        wavemaker=[{"side": "x_min", "kind": kind, "stroke": STROKE, "period": period}],
        surface={
            "size": [length, width],
            "centre": [0.5 * length, 0.0],
            "spacing": cell,
            "edges": {"x_min": "wall", "y_min": "wall", "y_max": "wall", "x_max": "absorb"},
        },
        run={"duration": 12 * period},
    )
    solution = Solution(survey(case))
    along = np.linspace(0.5 * wavelength, length, 12)  # the maker's own field has faded there
    gauges = solution.samplers().surface_sampler(np.column_stack([along, 0.0 * along]))
    times = np.arange(10 * period, 12 * period, solution.step)[:80]
    elevation, power = np.zeros((len(times), len(along))), np.zeros(len(times))
    for k, time in enumerate(times):
        solution.advance_to(time)
        state = solution.state(time)
        elevation[k], power[k] = gauges.elevation(state), solution.energy(state)[1]
    turns = np.exp(1j * frequency * times)
    harmonic = 2.0 / len(times) * (turns @ elevation)  # of exp(-i w t), over two whole periods
    both = np.column_stack([np.exp(1j * kh * along), np.exp(-1j * kh * along)])
    onward = abs(np.linalg.lstsq(both, harmonic, rcond=None)[0][0])
    wanted = height_over_stroke(kind, kh)
    assert 2 * onward / STROKE == pytest.approx(wanted, rel=0.02)
    carried = 0.5 * DENSITY * G * (0.5 * wanted * STROKE) ** 2
    carried *= float(group_speed(period, 1.0, G)) * width
    assert power.mean() == pytest.approx(carried, rel=0.04)  # goes with the height squared
