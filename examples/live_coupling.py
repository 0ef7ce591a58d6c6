"""Live coupling: ask the far field for velocities while it is being solved, step by step.

    python examples/live_coupling.py

The other solver is a cloud of particles that drift with the water. In regular waves each goes
round in a circle that does not quite close: after whole periods it has moved on by Stokes's drift,
(a k) (a w) exp(2 k z) for waves of amplitude a in deep water (Stokes 1847).
"""

import numpy as np

import bemwave

HEIGHT, PERIOD, PERIODS = 0.1, 3.0, 4
CASE = bemwave.Case(
    water={"depth": "deep"},
    # at phase 90 the particles start at the level they go round, which the formula is for
    waves=[{"kind": "regular", "height": HEIGHT, "period": PERIOD, "phase": 90.0}],
    surface={"size": [20.0, 4.0], "spacing": 1.0},
    run={"duration": PERIODS * PERIOD},
)


def main() -> tuple[np.ndarray, np.ndarray]:
    """Drift of particles at three depths [m/s]: found, and by Stokes's formula."""
    z = np.array([-0.5, -1.0, -2.0])
    start = np.column_stack([np.zeros((3, 2)), z])
    place, velocity, before = start.copy(), np.zeros((3, 3)), 0.0
    for state in bemwave.steps(CASE):
        step, before = state.time - before, state.time
        # Heun's rule: forward with the old velocity, then with the mean of old and new
        new = state.velocity(place + step * velocity)
        place += 0.5 * step * (velocity + new)
        velocity = state.velocity(place)
    found = (place - start)[:, 0] / (PERIODS * PERIOD)

    k = float(bemwave.wavenumber(PERIOD, np.inf))
    theory = (0.5 * HEIGHT) ** 2 * k * (2 * np.pi / PERIOD) * np.exp(2 * k * z)
    for level, one, other in zip(z, found, theory, strict=True):
        print(f"z = {level:5.2f} m: drift {1000 * one:.3f} mm/s, Stokes {1000 * other:.3f} mm/s")
    return found, theory


if __name__ == "__main__":
    main()
