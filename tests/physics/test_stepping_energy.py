"""Energy of the water in long runs: kept where nothing takes it, and never made.

"A closed tank with no damping keeps its energy", no other source: conservation of energy.
"""

import math

import numpy as np
import pytest
from scipy.integrate import cumulative_simpson

from bemwave.case import Case
from bemwave.flow.exact import LARGEST_TURN, exact_map, fastest_frequency
from bemwave.flow.panels import PanelFlow
from bemwave.geometry import forms
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.hull import place_hull
from bemwave.geometry.outline import SIDES, Circle, Rectangle
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.water_surface import fitted_water, water_surface
from bemwave.running.solution import Solution
from bemwave.running.survey import survey
from bemwave.stepping.stepper import Stepper

G = 9.81
DEPTH = 0.5


def box_in_a_random_mesh(jitter, seed):
    """Water round a box of 4 x 4 cells, 20 x 10 cells in all, nodes off the edges moved about."""
    cell, columns, rows = 0.1, 20, 10
    i, j = np.meshgrid(np.arange(columns + 1), np.arange(rows + 1))
    x, y = (i - 9) * cell, (j - 5) * cell
    hull = place_hull("box", forms.box(4 * cell, 4 * cell, 0.2, cell))
    covered = (abs(x) < 2.5 * cell) & (abs(y) < 2.5 * cell)
    fixed = covered | (i == 0) | (i == columns) | (j == 0) | (j == rows)
    points = np.stack([x, y, 0.0 * x], axis=-1).reshape(-1, 3)
    move = np.random.default_rng(seed).uniform(-jitter, jitter, (len(points), 2)) * cell
    points[~fixed.ravel(), :2] += move[~fixed.ravel()]
    inside = (abs(x + cell / 2) < 2 * cell) & (abs(y + cell / 2) < 2 * cell)
    cells = grid_triangles(rows, columns).reshape(rows, columns, 2, 3)[~inside[:-1, :-1]]
    used, triangles = np.unique(cells.reshape(-1, 3), return_inverse=True)
    water = SurfaceMesh.of_one_part(points[used], triangles.reshape(-1, 3), "water")
    return fitted_water(water, hull.polygons(), "the test's water"), hull


def box_tank(jitter=0.0, seed=0):
    water, hull = box_in_a_random_mesh(jitter, seed)
    return boundary_mesh(water, [hull], SIDES, DEPTH)


def round_tank(hull):
    water = water_surface(Circle(0.0, 0.0, 1.0), 0.13, [hull], 0.08)
    return boundary_mesh(water, [hull], ["rim"], DEPTH)


def oblong_tank(hull):
    water = water_surface(Rectangle(-1.0, 1.0, -0.5, 0.5), 0.13, [hull], 0.08)
    return boundary_mesh(water, [hull], SIDES, DEPTH)


TANKS = {
    "box, structured": box_tank,
    "box, random": lambda: box_tank(0.35),
    "cylinder": lambda: round_tank(place_hull("pile", forms.cylinder(0.3, 0.25, 0.1))),
    "pile on the bed": lambda: oblong_tank(
        place_hull("pile", forms.cylinder(0.2, DEPTH, 0.1, stands_on_bed=True))
    ),
    "flared hemisphere": lambda: round_tank(
        place_hull("ball", forms.sphere(0.35, -0.1, 0.1), position=(0.2, 0.1))
    ),
    "wedge": lambda: oblong_tank(place_hull("ship", forms.wigley(1.0, 0.3, 0.2, 0.1))),
}


@pytest.fixture(params=TANKS)
def tank(request):
    if not request.param.startswith("box"):
        request.getfixturevalue("needs_gmsh")
    return PanelFlow(TANKS[request.param](), DEPTH, closed=True)


def hump(flow):
    """A mound on one side, over water of the same volume as before, as if projected."""
    xy = flow.elements.points[: flow.elements.free, :2]
    mound = np.exp(-((xy - [-0.6, -0.15]) ** 2).sum(axis=1) / (2 * 0.2**2))
    return mound - (flow.mass @ mound).sum() / flow.mass.sum()


def energy(flow, state):
    """Per density [m^5/s^2]."""
    level, moving = state.elevation, state.potential
    return 0.5 * (G * level @ (flow.mass @ level) + moving @ (flow.surface_matrix @ moving))


def test_a_closed_tank_with_a_hull_keeps_its_energy_over_1000_periods(tank):
    """Of its slowest wave; no smoothing anywhere. Instants are the polynomials' own error too."""
    lowest = np.sort(np.linalg.eigvals(tank.solve_mass(tank.surface_matrix)).real)[1]
    period = 2 * math.pi / math.sqrt(G * lowest)
    step = LARGEST_TURN / fastest_frequency(tank.surface_matrix, tank.solve_mass, G)
    start = hump(tank)
    stepper = Stepper(tank, G, step, [], elevation=start)
    first = 0.5 * G * start @ (tank.mass @ start)
    kept = []
    for time in np.arange(0.0, 1000.5, 2.0) * period:
        while not stepper.ready(time):
            stepper.advance()
        kept.append(energy(tank, stepper.state(time)) / first)
    assert np.abs(np.array(kept) - 1.0).max() < 0.01
    # no trend: the best line through 1000 periods rises or falls by no more than it scatters
    line, covariance = np.polyfit(np.linspace(0.0, 1.0, len(kept) - 1), kept[1:], 1, cov=True)
    assert abs(line[0]) < max(4.0 * math.sqrt(covariance[0, 0]), 1e-4)


@pytest.mark.parametrize("seed", range(3))
def test_the_absorber_only_takes_energy(seed):
    """200 periods on a random mesh with a hull: no step may gain."""
    water, hull = box_in_a_random_mesh(0.4, seed)
    flow = PanelFlow(boundary_mesh(water, [hull]), DEPTH, closed=False)
    e = flow.elements
    x, y = np.abs(e.water_table[:, 24:26] - [0.1, 0.0]).T
    beyond = np.maximum(np.maximum(x - 0.5, y - 0.2), 0.0)
    damping = e.weighted_mass(40.0 * beyond**2)
    step = LARGEST_TURN / fastest_frequency(flow.surface_matrix, flow.solve_mass, G)
    stepper = Stepper(flow, G, step, [], damping=damping, elevation=hump(flow))
    exact = exact_map(flow.surface_matrix, flow.solve_mass, G, step)
    kept = []
    while stepper.time < 200 * 2.0:  # its slowest waves take some 2 s
        stepper.advance()
        if stepper.count > 1:
            # kept by free steps to the last bit: g E'ME/2 + phi_n' M A_dt phi_n+1/2
            history = stepper.history()
            before, after = (p[:, 0] for p in list(history.values())[-3:-1])
            mean = history["mean"][:, 0]
            lifted, moving = flow.mass @ mean, flow.mass @ (exact @ after)
            kept.append(0.5 * (G * mean @ lifted + before @ moving))
    kept = np.array(kept)
    assert np.diff(kept).max() < 1e-13 * kept[0]
    assert kept[-1] < 1e-6 * kept[0]


PERIOD = 2.0
FLUME = {"x_min": "wall", "y_min": "wall", "y_max": "wall", "x_max": "absorb"}
DRIVEN = {
    "wavemaker": {
        "wavemaker": [{"side": "x_min", "kind": "piston", "stroke": 0.1, "period": PERIOD}],
        "surface": {"size": [6.4, 2.0], "centre": [3.2, 0.0], "spacing": 0.4, "edges": FLUME},
    },
    "rolling box": {
        "body": [
            {
                "name": "barge",
                "form": "box",
                "length": 2.0,
                "beam": 1.0,
                "draught": 0.4,
                "panel_size": 0.25,
                "attitude": "forced",
                "forced": {"mode": "roll", "amplitude": 5.0, "period": PERIOD},
            }
        ],
        "surface": {"size": [8.0, 8.0], "spacing": 0.7, "fine_spacing": 0.25},
    },
    "patch": {
        "pressure": [
            {"head": 0.1, "width": 1.0, "centre": [-3.0, 0.0], "velocity": [0.6, 0.0]}
        ],
        "surface": {"size": [10.0, 8.0], "spacing": 0.6},
    },
}  # fmt: skip


@pytest.mark.parametrize("driven", DRIVEN)
def test_the_ledger_closes(driven, request):
    """What is put in is there or was absorbed, within 1 % of the work done."""
    if driven == "rolling box":
        request.getfixturevalue("needs_gmsh")
    case = Case(water={"depth": 1.0}, run={"duration": 4 * PERIOD}, **DRIVEN[driven])
    solution = Solution(survey(case))
    times = np.arange(0.0, 4 * PERIOD, solution.step)
    rows = np.empty((len(times), 3))
    for k, time in enumerate(times):
        solution.advance_to(time)
        rows[k] = solution.energy(solution.state(time))
    stored, power, taken = rows.T
    put_in = cumulative_simpson(power, x=times, initial=0.0)
    absorbed = cumulative_simpson(taken, x=times, initial=0.0)
    missing = stored - stored[0] - put_in + absorbed
    work = cumulative_simpson(np.abs(power), x=times)[-1]
    assert np.abs(missing).max() < 0.01 * work
    assert absorbed[-1] > 0.02 * work  # so that all three took part
