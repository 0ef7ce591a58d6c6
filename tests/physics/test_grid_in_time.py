"""Route "grid" in time, with a hull: energy after the forcing stops, and the same sea on panels.

"Nothing may grow where nothing is put in" and "one water, whatever the method": no other source.
"""

import math

import numpy as np
import pytest

from bemwave.case import Case
from bemwave.flow.grid import GridFlow
from bemwave.flow.sheet import Sheet
from bemwave.geometry.forms import sphere
from bemwave.geometry.hull import place_hull
from bemwave.geometry.waterplane import closed_bodies
from bemwave.running.solution import Solution
from bemwave.running.survey import survey
from bemwave.stepping.absorber import layer_for
from bemwave.stepping.stepper import Stepper

G = 9.81
PERIOD = 2.0
LENGTH = G * PERIOD**2 / (2.0 * math.pi)
SPACING, USEFUL = 0.25, 4.0  # m; the useful water's side
STEP = PERIOD / 32


class Heave:
    """Up and down a few times, begun and ended smoothly."""

    def __init__(self, flow, ends):
        self._normal, self.ends = flow.elements.hull_table[:, 11:12], ends

    def flux(self, times):
        share = np.sin(math.pi * np.clip(times / self.ends, 0.0, 1.0))
        return self._normal * share**4 * np.cos(2.0 * math.pi * times / PERIOD)

    def rate(self, times):
        raise NotImplementedError  # for states alone


def water_and_ball(panel):
    """The flow round a floating hemisphere of radius .75 off the nodes, and its absorber."""
    hull = place_hull("ball", sphere(0.75, 0.0, panel), position=(0.05, -0.03))
    layer = layer_for(LENGTH, math.inf, G, SPACING, behind="itself")
    count = 8 * math.ceil((USEFUL + 2.0 * layer.width) / SPACING / 8)
    corner = -0.5 * count * SPACING
    sheet = Sheet(corner, corner, SPACING, (count, count))
    flow = GridFlow(sheet, closed_bodies([hull]), [hull.polygons()])

    def rate(xy):
        return layer.rate(np.clip(np.abs(xy).max(axis=1) - USEFUL / 2, 0.0, layer.width))

    return flow, flow.damping(rate)


def energy_over(flow, stepper, until):
    """Times, and the energy per density that free steps keep to the last bit [m^5/s^2]."""
    kept, times = [], []
    # g E'ME/2 + phi_n' M A_dt phi_n+1/2; A_dt as the steps themselves have it
    march = flow.march(G, stepper.step)
    still = march.given([np.zeros((len(flow.elements.hull), 1))])[0]
    while stepper.time < until:
        stepper.advance()
        history = stepper.history()
        *potentials, mean = history.values()
        if len(potentials) > 1:
            before, after = potentials[-2:]
            moving = flow.mass @ march.flux(after, still)
            kept.append(0.5 * float((G * mean * (flow.mass @ mean) + before * moving).sum()))
            times.append(stepper.time)
    return np.array(times), np.array(kept)


def driven(start, flow, damping):
    """A stepper, and when its forcing ends."""
    if start == "heave":
        ends = 3.0 * PERIOD
        return Stepper(flow, G, STEP, [Heave(flow, ends)], damping=damping), ends
    away = flow.sheet.xy - [1.4, 1.4]
    mound = flow.continuation(np.exp(-(away**2).sum(axis=1) / (2.0 * 0.6**2)))
    return Stepper(flow, G, STEP, [], damping=damping, elevation=mound), 0.0


@pytest.mark.parametrize(
    ("panel", "periods"), [(0.25, 21), pytest.param(0.2, 200, marks=pytest.mark.long)]
)
@pytest.mark.parametrize("start", ["heave", "mound"])
def test_after_forcing_stops_energy_never_grows_and_leaves(start, panel, periods):
    flow, damping = water_and_ball(panel)
    stepper, ends = driven(start, flow, damping)
    times, kept = energy_over(flow, stepper, ends + periods * PERIOD)
    free = kept[times > ends + 2.0 * STEP]  # the forcing is smoothed over two steps
    peak = kept.max()
    left = kept[times > ends + 20.0 * PERIOD].max() / peak
    print(start, flow.sheet.shape, f"left {left:.2g}, growth {np.diff(free).max() / peak:.2g}")
    assert np.diff(free).max() < 1e-14 * peak
    assert kept.min() > -1e-14 * peak  # an unstable mode would have less than none
    assert left < {"heave": 1e-12, "mound": 1e-7}[start]


BALL = {"name": "ball", "form": "sphere", "radius": 1.0}
SAME = {
    "water": {"depth": "deep"},
    "waves": [{"kind": "regular", "height": 0.1, "period": PERIOD}],
    "run": {"duration": 5.0 * PERIOD},
}


def field(route, surface, panel):
    """Solved and total elevations and velocities in the last period, at gauges and on a box."""
    water = {"size": [7.0, 7.0], "route": route, "absorber": 8.0, **surface}
    surveyed = survey(Case(**SAME, surface=water, body=[BALL | {"panel_size": panel}]))
    solution = Solution(surveyed)
    samplers = solution.samplers()
    gauges = np.array([[2, 0], [-2, 0], [0, 2], [2, 2], [3, 0], [0, -3]], dtype=float)
    side = np.linspace(-2.25, 2.25, 10)
    x, z = (g.ravel() for g in np.meshgrid(side, [0.0, -0.3, -0.8, -1.5]))
    far = np.full(len(x), 2.25)
    faces = [np.column_stack([x, s * far, z]) for s in (-1, 1)]
    faces += [np.column_stack([s * far, x, z]) for s in (-1, 1)]
    box = np.concatenate(faces)
    surface_at, points_at = samplers.surface_sampler(gauges), samplers.sampler(box)
    sea_on, sea_in = (
        surveyed.sea.at(np.column_stack([gauges, np.zeros(len(gauges))])),
        surveyed.sea.at(box),
    )
    rows = []
    for time in np.linspace(4.0, 5.0, 9) * PERIOD:
        solution.advance_to(time)
        state = solution.state(time)
        rows.append(
            (
                surface_at.elevation(state),
                points_at.velocity(state),
                sea_on.elevation(time),
                sea_in.velocity(time),
            )
        )
    level, velocity, incident, flow = (np.array(parts) for parts in zip(*rows, strict=True))
    return {
        "solved elevation": level,
        "solved velocity": velocity,
        "elevation": level + incident,
        "velocity": velocity + flow,
    }


@pytest.mark.long
def test_both_routes_make_the_same_water(needs_gmsh):
    """A hemisphere in regular waves; the box is five spacings from it."""
    grid = field("grid", {"spacing": 0.25}, 0.25)
    panels = field("panels", {"spacing": 0.6, "fine_spacing": 0.25}, 0.25)
    worst = {
        name: np.abs(grid[name] - panels[name]).max() / np.abs(panels[name]).max() for name in grid
    }
    print({name: f"{figure:.2%}" for name, figure in worst.items()})
    assert worst["elevation"] < 0.01
    assert worst["velocity"] < 0.02
    # of the solved part alone; on z = 0 the grid's velocities still ring from the waterline
    assert worst["solved elevation"] < 0.02
    assert worst["solved velocity"] < 0.05


def test_a_state_in_single_precision_is_as_good():
    """What its rounding adds in fifteen periods, against the same run in double precision."""
    surface = {"size": [12.0, 12.0], "spacing": 0.25, "absorber": 6.0, "route": "grid"}
    ball = {"name": "ball", "form": "sphere", "radius": 0.75, "panel_size": 0.25}
    forced = {"mode": "heave", "amplitude": 0.1, "period": 2.0}
    states, loads = [], []
    for precision in ("double", "single"):
        case = Case(
            water={"depth": "deep"},
            surface=surface,
            waves=[{"kind": "regular", "height": 0.2, "period": 2.4}],
            body=[ball | {"attitude": "forced", "forced": forced}],
            run={"duration": 30.0, "precision": precision},
        )
        solution = Solution(survey(case))
        solution.advance_to(30.0)
        states.append(solution.state(30.0))
        loads.append(solution.loads(30.0)["force"])

    def apart(one, other):
        return np.abs(one - other).max() / np.abs(one).max()

    fields = "elevation", "surface_flux"
    named = {name: apart(*(getattr(state, name) for state in states)) for name in fields}
    print({name: f"{figure:.1e}" for name, figure in named.items()}, f"force {apart(*loads):.1e}")
    assert 0.0 < named["elevation"] < 2e-5
    assert 0.0 < named["surface_flux"] < 5e-4
    assert 0.0 < apart(*loads) < 1e-5
