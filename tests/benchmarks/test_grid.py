"""Route "grid": its surface flux and its step against a bare pair of real Fourier transforms.

Run with: python -m pytest tests/benchmarks/test_grid.py --benchmark-only -s, which prints the table
of README. A pair is scipy's rfft2 and irfft2 of one field on the same grid, on all cores. An
evaluation of the surface flux is one in a run: what given flux adds is worked out for a block of
steps at once, and counts with its share. What is compared is timed in turn, and the least of each
counts.
"""

import itertools
import math
import time

import numpy as np
import pytest
from scipy import fft

from bemwave.case import Case
from bemwave.flow.grid import GridFlow
from bemwave.flow.grid_samplers import GridSamplers
from bemwave.flow.sheet import Sheet
from bemwave.geometry.forms import sphere
from bemwave.geometry.hull import place_hull
from bemwave.geometry.waterplane import closed_bodies
from bemwave.running.solution import Solution
from bemwave.running.survey import survey
from bemwave.stepping.forcing import MovingParts, Oscillation, Ramp
from bemwave.stepping.stepper import BLOCK, Stepper

SIDES = (256, 512, 1024, 2048)
RADIUS, PANEL = 6.0, 0.59  # spacings: a hemisphere of a thousand panels
ROUNDS = 15
GRAVITY = 9.81


def least(works, rounds=ROUNDS):
    """Least seconds of each of some pieces of work, done in turn; one round to warm up."""
    taken = dict.fromkeys(works, math.inf)
    for number in range(rounds + 1):
        for work in works:
            start = time.perf_counter()
            work()
            if number:
                taken[work] = min(taken[work], time.perf_counter() - start)
    return [taken[work] for work in works]


def heaving(side):
    """A grid, its flow round a hemisphere in heave, the flux given, and steps with an absorber."""
    hull = place_hull("ball", sphere(RADIUS, 0.0, PANEL), position=(0.3, 0.4))
    assert len(hull.mesh.triangles) == pytest.approx(1000, rel=0.05)
    sheet = Sheet(-side / 2, -side / 2, 1.0, (side, side))
    flow = GridFlow(sheet, closed_bodies([hull]), [hull.polygons()])
    heave = flow.elements.hull_table[:, 11:12]
    rim = np.maximum(np.abs(sheet.xy).max(axis=1) - 0.4 * side, 0.0)
    stepper = Stepper(
        flow,
        GRAVITY,
        0.1,
        [MovingParts(heave, [Oscillation(0.1, 4.0, Ramp(0.0))])],
        damping=flow.damping(lambda xy: rim / side),
    )
    return sheet, flow, heave, stepper


def times_at(side):
    """Seconds of a pair, an evaluation of surface flux and a step."""
    _, flow, heave, stepper = heaving(side)
    for _ in range(BLOCK):
        stepper.advance()
    field = stepper.parts_at(stepper.time)[0]
    plain = field.reshape(1, side, side)

    def pair():
        fft.irfft2(fft.rfft2(plain, workers=-1), s=plain.shape[1:], workers=-1)

    march, block = flow.march(GRAVITY, 0.1), np.repeat(heave, BLOCK, axis=1)
    given = march.given([block])

    def prepare():
        march.given([block])

    def evaluate():
        march.flux(field, given[0])

    taken = least([pair, evaluate, stepper.advance, prepare])
    return taken[0], taken[1] + taken[3] / BLOCK, taken[2]


def test_against_pairs_of_transforms(benchmark):
    rows = {side: times_at(side) for side in SIDES}
    benchmark.pedantic(lambda: None)
    print("\n| grid | pair of transforms | surface flux | step |\n|---|---|---|---|")
    for side, (pair, evaluation, step) in rows.items():
        print(
            f"| {side} x {side} | {1e3 * pair:.3g} ms | {evaluation / pair:.2g} pairs "
            f"| {step / pair:.2g} pairs |"
        )
    sides = np.array(SIDES, dtype=float)
    work = sides**2 * np.log(sides**2)
    slope = np.polyfit(np.log(work), np.log([row[1] for row in rows.values()]), 1)[0]
    print(f"surface flux grows as (N log N)^{slope:.2f}")
    benchmark.extra_info["slope"] = round(float(slope), 2)
    for side, (pair, evaluation, step) in rows.items():
        assert evaluation <= (5.0 if side == 256 else 4.0) * pair
        assert step <= 8.0 * pair
    assert slope <= 1.1


@pytest.mark.usefixtures("needs_gmsh")
def test_against_panels(benchmark):
    """A step of the same sea by both routes, about as large as panels can do in a minute."""
    case = {
        "water": {"depth": "deep"},
        "run": {"duration": 10.0},
        "body": [{"name": "ball", "form": "sphere", "radius": 3.0, "panel_size": 0.5}],
        "hump": [{"height": 0.1, "width": 2.0, "centre": [0.0, 10.0]}],
    }
    water = {"size": [40.0, 40.0], "spacing": 0.8, "absorber": 12.0}
    works, unknowns = [], {}
    for route in ("panels", "grid"):
        solution = Solution(survey(Case(surface={**water, "route": route}, **case)))
        for _ in range(BLOCK):
            solution.stepper.advance()
        works.append(solution.stepper.advance)
        unknowns[route] = len(solution.flow.places)
    panels, grid = least(works, BLOCK - 1)
    benchmark.pedantic(works[1], rounds=3)
    print(
        f"\na step on panels ({unknowns['panels']} unknowns) takes {panels / grid:.3g} times that "
        f"on the grid ({unknowns['grid']} nodes): {1e3 * panels:.3g} and {1e3 * grid:.3g} ms"
    )
    benchmark.extra_info["panels over grid"] = round(panels / grid, 1)
    assert grid < panels


def test_sampling_against_a_step(benchmark):
    """Velocities at 20 000 points of a box about a hull, of a state just reached, at 1024^2.

    They may cost what a step may, eight pairs of transforms.
    """
    sheet, flow, _, stepper = heaving(1024)
    for _ in range(BLOCK):
        stepper.advance()
    # a box of 40 by 30 by 20 spacings, five from the hull: its sides and its bottom
    x, y, z = np.arange(-20.0, 20.1, 0.4), np.arange(-15.0, 15.1, 0.4), np.arange(-20.0, 0.1, 0.4)
    faces = [np.meshgrid([s], y, z) for s in (-20.0, 20.0)]
    faces += [np.meshgrid(x, [s], z) for s in (-15.0, 15.0)] + [np.meshgrid(x, y, [-20.0])]
    points = np.vstack([np.stack([c.ravel() for c in face], axis=1) for face in faces])
    points = np.random.default_rng(1).choice(points, 20_000, replace=False)
    sampler = GridSamplers(sheet, flow.elements).sampler(points)
    at = itertools.count(1)

    def sample():
        sampler.velocity(states[next(at) % len(states)])

    states = [stepper.state(stepper.time - 0.01 * n) for n in range(4)]
    plain = np.zeros((1, *sheet.shape))
    pair, step, sampled = least(
        [lambda: sheet.back(sheet.transform(plain)), stepper.advance, sample]
    )
    benchmark.pedantic(sample, rounds=3)
    print(f"\n{len(points)} points take {sampled / pair:.2g} pairs, {sampled / step:.2g} steps")
    benchmark.extra_info["pairs"] = round(sampled / pair, 2)
    assert sampled <= 8.0 * pair
