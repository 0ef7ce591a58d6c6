"""Steps in time of a small tank with a moving wall, against the tank's own modes.

With S u = (w^2/g) M u the modes of the flow map, everything has a closed form: free waves are
cosines, and a wall that moves drives each mode as an oscillator.
"""

from dataclasses import dataclass

import numpy as np
import pytest
from scipy import linalg

from bemwave.flow.exact import LARGEST_TURN, exact_map, fastest_frequency
from bemwave.flow.panels import PanelFlow
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.outline import SIDES, Rectangle
from bemwave.geometry.water_surface import structured_water
from bemwave.stepping.forcing import PressurePatch
from bemwave.stepping.stepper import STENCIL, Stepper

G = 9.81
DEPTH = 0.5


@dataclass(frozen=True)
class Tank:
    flow: PanelFlow
    frequency: np.ndarray
    modes: np.ndarray
    wall: np.ndarray

    def potential(self, drive):
        """(free,) from the amplitude (modes,) of each mode per unit of what drives it."""
        load = self.modes.T @ (self.flow.hull_flux_matrix @ self.wall)
        return self.modes @ (load * drive)


@dataclass(frozen=True)
class Given:
    """A flux shape (triangles,) times a function of time."""

    shape: np.ndarray
    value: object
    slope: object

    def flux(self, times):
        return self.shape[:, None] * self.value(times)

    def rate(self, times):
        return self.shape[:, None] * self.slope(times)


@pytest.fixture(scope="module")
def tank():
    water = structured_water(Rectangle(0.0, 2.0, 0.0, 1.0), 0.125)
    mesh = boundary_mesh(water, [], SIDES, DEPTH)
    flow = PanelFlow(mesh, DEPTH, closed=True)
    value, modes = linalg.eigh(flow.surface_matrix, flow.mass.toarray())
    part = mesh.part[flow.elements.hull_triangles]
    wall = np.where(part == mesh.part_names.index("wall_x_min"), 1.0, 0.0)
    return Tank(flow, np.sqrt(G * np.maximum(value, 0.0)), modes, wall)


def longest_step(tank):
    return LARGEST_TURN / tank.frequency[-1]


def test_fastest_frequency_is_a_close_bound(tank):
    found = fastest_frequency(tank.flow.surface_matrix, tank.flow.solve_mass, G)
    assert tank.frequency[-1] <= found < 1.03 * tank.frequency[-1]


@pytest.mark.parametrize("turn", [0.05, 0.6, LARGEST_TURN])
def test_exact_map_is_the_cosine_of_the_flow_map(tank, turn):
    step = turn / tank.frequency[-1]
    found = exact_map(tank.flow.surface_matrix, tank.flow.solve_mass, G, step)
    value = 2.0 * (1.0 - np.cos(tank.frequency * step)) / (G * step**2)
    wanted = (tank.modes * value) @ tank.modes.T @ tank.flow.mass.toarray()
    assert np.abs(found - wanted).max() < 1e-12 * np.abs(wanted).max()


@pytest.mark.parametrize("mode", [1, 40, -1])
def test_free_waves_are_exact_over_1000_periods(tank, mode):
    frequency, shape = tank.frequency[mode], tank.modes[:, mode]
    stepper = Stepper(tank.flow, G, longest_step(tank), [], elevation=shape.copy())
    last = 2000.0 * np.pi / frequency
    worst = 0.0
    while stepper.time < last:
        stepper.advance()
        if stepper.time > 0.99 * last:
            # eta = shape cos(w t) and d(phi)/dt = -g eta
            exact = -G / frequency * np.sin(frequency * stepper.time) * shape
            error = stepper.parts_at(stepper.time)[0][:, 0] - exact
            worst = max(worst, np.abs(error).max() * frequency / G / np.abs(shape).max())
    assert worst < 1e-10


OMEGA = 5.0
STARTS = {
    # q and dq/dt, and a mode's response: a'' + w^2 a = -g q from rest
    "at once": (
        lambda t: np.cos(OMEGA * t),
        lambda t: -OMEGA * np.sin(OMEGA * t),
        lambda w, t: -G * (np.cos(OMEGA * t) - np.cos(w * t)) / (w**2 - OMEGA**2),
    ),
    "smooth": (
        lambda t: 1.0 - np.cos(OMEGA * t),
        lambda t: OMEGA * np.sin(OMEGA * t),
        lambda w, t: (
            -G * 0.5 * (t * np.sinc(w * t / (2 * np.pi))) ** 2
            + G * (np.cos(OMEGA * t) - np.cos(w * t)) / (w**2 - OMEGA**2)
        ),
    ),
}


@pytest.mark.parametrize("start", STARTS)
def test_forced_motion_is_right_to_the_fourth_order(tank, start):
    value, slope, response = STARTS[start]
    errors = []
    for finer in (1, 2, 4):
        step = longest_step(tank) / finer
        stepper = Stepper(tank.flow, G, step, [Given(tank.wall, value, slope)])
        for _ in range(24 * finer):
            stepper.advance()
        exact = tank.potential(response(tank.frequency, stepper.time))
        error = stepper.parts_at(stepper.time)[0][:, 0] - exact
        errors.append(np.linalg.norm(error) / np.linalg.norm(exact))
    order = np.log2(np.array(errors[:-1]) / errors[1:])
    assert order.min() > 3.8
    assert errors[0] < 3e-3  # with the longest step there is, of 24 in all


def test_states_between_steps(tank):
    """A wave that turns by .15 a step, as 40 steps a period give: eta, flux and rates."""
    mode = 3
    frequency, shape = tank.frequency[mode], tank.modes[:, mode]
    stepper = Stepper(tank.flow, G, 0.15 / frequency, [], elevation=shape.copy())
    for _ in range(60):
        stepper.advance()
    for back in (3.0, 3.4, 3.9):
        time = (stepper.count - back) * stepper.step
        state = stepper.state(time)
        c, s = np.cos(frequency * time), np.sin(frequency * time)
        scale = np.abs(shape).max()
        wanted = {
            "elevation": shape * c,
            "potential": -G / frequency * shape * s,
            "potential_rate": -G * shape * c,
            "surface_flux": -frequency * shape * s,
            "surface_flux_rate": -(frequency**2) * shape * c,
        }
        for name, exact in wanted.items():
            size = {"elevation": 1, "potential": G / frequency, "potential_rate": G}.get(
                name, frequency if name == "surface_flux" else frequency**2
            )
            assert np.abs(getattr(state, name) - exact).max() < 1e-6 * size * scale, name


def test_state_keeps_the_conditions_on_walls_and_surface(tank):
    """The wall's own flux in the state, and as much water lifted as the wall pushes in."""
    given = Given(tank.wall, lambda t: np.sin(2.0 * t), lambda t: 2.0 * np.cos(2.0 * t))
    stepper = Stepper(tank.flow, G, 0.02, [given])
    for _ in range(40):
        stepper.advance()
    time = (stepper.count - 3) * stepper.step
    state = stepper.state(time)
    np.testing.assert_allclose(state.hull_flux, tank.wall * np.sin(2.0 * time), atol=1e-15)
    np.testing.assert_allclose(state.hull_flux_rate, tank.wall * 2 * np.cos(2.0 * time), atol=1e-15)
    ones = np.ones(len(state.potential))
    lifted = ones @ (tank.flow.mass @ state.surface_flux)
    # the flux is along the normal out of the tank, so the wall makes room for 1 x 1/2 m2 of it
    assert lifted == pytest.approx(-DEPTH * np.sin(2.0 * time), rel=1e-9)
    volume = ones @ (tank.flow.mass @ state.elevation)
    assert volume == pytest.approx(-DEPTH * (1.0 - np.cos(2.0 * time)) / 2.0, rel=1e-5)


def test_parts_are_kept_apart_and_add_up(tank):
    one = Given(tank.wall, lambda t: np.sin(3.0 * t), lambda t: 3.0 * np.cos(3.0 * t))
    two = Given(0.5 * tank.wall, lambda t: np.sin(7.0 * t), lambda t: 7.0 * np.cos(7.0 * t))
    both = Stepper(tank.flow, G, 0.02, [one, two])
    alone = [Stepper(tank.flow, G, 0.02, [part]) for part in (one, two)]
    for stepper in (both, *alone):
        for _ in range(50):
            stepper.advance()
    time = both.time - 0.07
    apart = both.parts_at(time)[0]
    for k in range(2):
        np.testing.assert_allclose(apart[:, k], alone[k].parts_at(time)[0][:, 0], atol=1e-12)
    states = [stepper.state(time) for stepper in alone]
    for name in ("elevation", "potential", "hull_potential", "surface_flux", "hull_flux"):
        total = sum(getattr(state, name) for state in states)
        np.testing.assert_allclose(getattr(both.state(time), name), total, atol=1e-11)


def _driven(tank):
    """A stepper with all that drives or damps one."""
    rate = np.linspace(0.0, 2.0, len(tank.flow.elements.water))
    return Stepper(
        tank.flow,
        G,
        0.02,
        [Given(tank.wall, lambda t: np.sin(3.0 * t), lambda t: 3.0 * np.cos(3.0 * t))],
        patches=[PressurePatch(0.01, 0.2, (0.5, 0.5), (0.3, 0.0))],
        damping=tank.flow.elements.weighted_mass(rate),
        elevation=0.01 * tank.modes[:, 2],
    )


@pytest.mark.parametrize("count", [5, 31, 32, 77])
def test_a_restored_stepper_goes_on_bit_for_bit(tank, count):
    whole, first = _driven(tank), _driven(tank)
    for _ in range(150):
        whole.advance()
    for _ in range(count):
        first.advance()
    kept = {name: array.copy() for name, array in first.history().items()}
    second = _driven(tank)
    second.restore(kept, count)
    for _ in range(150 - count):
        second.advance()
    assert second.time == whole.time
    for name, array in whole.history().items():
        np.testing.assert_array_equal(second.history()[name], array)
    time = whole.time - 3.3 * whole.step
    for name, array in vars(whole.state(time)).items():
        np.testing.assert_array_equal(getattr(second.state(time), name), array)


def test_ready_once_the_stencil_stands_round_a_time(tank):
    stepper = Stepper(tank.flow, G, 0.02, [], elevation=tank.modes[:, 1].copy())
    taken = 0
    while not stepper.ready(0.0):
        stepper.advance()
        taken += 1
    assert taken == STENCIL - 1
    while not stepper.ready(0.205):
        stepper.advance()
    # three steps after, four before, and the time itself in the middle
    assert stepper.time == pytest.approx(0.205 + 3.25 * 0.02 + 0.01)


def test_a_hump_is_there_at_the_first_instant(tank):
    shape = tank.modes[:, 3]
    stepper = Stepper(tank.flow, G, 0.15 / tank.frequency[3], [], elevation=shape.copy())
    while not stepper.ready(0.0):
        stepper.advance()
    assert np.abs(stepper.state(0.0).elevation - shape).max() < 1e-5 * np.abs(shape).max()


def test_a_patch_that_stands_still_pushes_the_water_down_by_its_head(tank):
    """Let go gently (damped), the surface ends level but for the patch: p + rho g eta uniform."""
    patch = PressurePatch(0.02, 0.3, (1.0, 0.5), (0.0, 0.0))
    rate = np.full(len(tank.flow.elements.water), 3.0)
    damping = tank.flow.elements.weighted_mass(rate)
    stepper = Stepper(tank.flow, G, 0.03, [], patches=[patch], damping=damping)
    for _ in range(1500):
        stepper.advance()
    elevation = stepper.state(stepper.time - 0.1).elevation
    xy = tank.flow.elements.points[: len(elevation), :2]
    level = elevation + patch.value(xy, 0.0)
    assert np.ptp(level) < 1e-6 * np.ptp(elevation)
