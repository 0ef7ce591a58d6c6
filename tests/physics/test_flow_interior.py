"""The field inside a tank against finite elements (scikit-fem) with the same boundary data."""

import numpy as np
import pytest

from bemwave.flow.panels import PanelFlow
from bemwave.flow.samplers import PanelSamplers
from bemwave.flow.state import SurfaceState
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.outline import SIDES, Rectangle
from bemwave.geometry.water_surface import water_surface
from bemwave.kernels.panels import SEVEN

LENGTH, WIDTH, DEPTH = 2.0, 1.0, 0.5
SPACING = 0.08
DENSITY = 1025.0


def surface_potential(x, y):
    """Smooth, level at the walls (else corners are singular), and no sum of a few modes."""
    return np.exp(np.cos(0.5 * np.pi * x) + np.cos(np.pi * y))


def load(elements, function):
    """(free,) int over F of function(x, y) hat_i, by Dunavant's rule of seven points."""
    result = np.zeros(len(elements.points))
    corners = elements.points[elements.water]
    for rule in SEVEN:
        at = np.einsum("j,mjc->mc", rule[:3], corners)
        value = elements.water_table[:, 28] * rule[3] * function(at[:, 0], at[:, 1])
        for j in range(3):
            np.add.at(result, elements.water[:, j], value * rule[j])
    return result[: elements.free]


@pytest.fixture(scope="module")
def panels():
    water = water_surface(Rectangle(0.0, LENGTH, 0.0, WIDTH), SPACING)
    mesh = boundary_mesh(water, walls=SIDES, depth=DEPTH)
    flow = PanelFlow(mesh, DEPTH, closed=True)
    phi = flow.solve_mass(load(flow.elements, surface_potential))
    still = np.zeros(len(flow.elements.hull))
    flux, hull = flow.surface_flux(phi, still), flow.hull_potential(phi, still)
    state = SurfaceState(0.0, phi, phi, phi, flux, flux, hull, hull, still, still)
    return PanelSamplers(mesh, DEPTH, closed=True, density=DENSITY), state


@pytest.fixture(scope="module")
def places():
    """Inside, a panel or more from walls; from just under the surface down to the bed."""
    rng = np.random.default_rng(2)
    low, high = [SPACING, SPACING, -DEPTH], [LENGTH - SPACING, WIDTH - SPACING, -0.01]
    return rng.uniform(low, high, size=(150, 3))


@pytest.fixture(scope="module")
def by_finite_elements(places):
    """Potential and velocity at the places: quadratic bricks, no flux but through the top."""
    import skfem
    from skfem.models.poisson import laplace

    grid = skfem.MeshHex.init_tensor(
        np.linspace(0, LENGTH, 31), np.linspace(0, WIDTH, 16), np.linspace(-DEPTH, 0, 11)
    ).with_boundaries({"top": lambda x: x[2] > -1e-9})
    basis = skfem.Basis(grid, skfem.ElementHex2(), intorder=4)
    top = basis.get_dofs("top")
    phi = np.zeros(basis.N)
    x = basis.doflocs[:, top.all()]
    phi[top.all()] = surface_potential(x[0], x[1])
    inner = skfem.condense(laplace.assemble(basis), x=phi, D=top)
    phi = skfem.solve(*inner, solver=skfem.solver_iter_pcg(rtol=1e-9))
    gradient = basis.interpolate(phi).grad
    mass = skfem.BilinearForm(lambda u, v, _: u * v).assemble(basis)
    product = skfem.LinearForm(lambda v, w: w.slope * v)
    solver = skfem.solver_iter_pcg(rtol=1e-9)
    slopes = [
        skfem.solve(mass, product.assemble(basis, slope=gradient[axis]), solver=solver)
        for axis in range(3)
    ]
    at = basis.probes(places.T)
    return at @ phi, np.column_stack([at @ slope for slope in slopes])


def test_potential(panels, places, by_finite_elements):
    samplers, state = panels
    # the state's rates are its values: pressure is then -density times potential
    found = samplers.sampler(places).pressure(state) / -DENSITY
    exact = by_finite_elements[0]
    error = np.abs(found - exact).max() / np.abs(exact).max()
    # measured: .08 %
    assert error < 0.01


def test_velocity(panels, places, by_finite_elements):
    samplers, state = panels
    found = samplers.sampler(places).velocity(state)
    exact = by_finite_elements[1]
    error = np.linalg.norm(found - exact, axis=1).max() / np.linalg.norm(exact, axis=1).max()
    # measured: .56 %, of which the finite elements have about .4 %
    assert error < 0.01
