"""A wave tank: does a piston of known stroke make waves of the height that theory gives?

    python examples/wave_tank.py

A piston wavemaker at one end, an absorbing beach at the other. Theory: height/stroke =
2 (cosh 2kh - 1) / (sinh 2kh + 2kh) (Havelock 1929; Dean & Dalrymple 1991, eq. 6.23).
"""

import sys

import numpy as np
import xarray

import bemwave

DEPTH, PERIOD, STROKE = 0.8, 1.4, 0.02
CASE = bemwave.Case(
    title="A piston in a tank",
    water={"depth": DEPTH},
    surface={
        "size": [6.0, 1.0],
        "spacing": 0.2,
        "edges": {"x_min": "wall", "x_max": "absorb", "y_min": "wall", "y_max": "wall"},
    },
    wavemaker=[{"side": "x_min", "kind": "piston", "stroke": STROKE, "period": PERIOD}],
    run={"duration": 12.6},
    gauge=[{"position": [x, 0.0]} for x in (0.5, 1.0, 1.5, 2.0)],
)


def main(folder: str) -> tuple[float, float]:
    """Height of the waves over the stroke of the piston: measured, and by theory."""
    run = bemwave.run(CASE, folder)
    with xarray.open_dataset(run.folder.gauges) as gauges:
        late = gauges.elevation.sel(time=slice(6 * PERIOD, None)).load()
    # amplitude at the piston's frequency, by least squares; the mean over the gauges
    turn = 2 * np.pi / PERIOD * late.time.values[:, None]
    basis = np.hstack([np.cos(turn), np.sin(turn), np.ones_like(turn)])
    parts = np.linalg.lstsq(basis, late.values, rcond=None)[0]
    measured = float(2 * np.hypot(parts[0], parts[1]).mean() / STROKE)

    twice = 2 * float(bemwave.wavenumber(PERIOD, DEPTH)) * DEPTH
    theory = float(2 * (np.cosh(twice) - 1) / (np.sinh(twice) + twice))
    print(f"height/stroke: measured {measured:.4f}, theory {theory:.4f}")
    return measured, theory


if __name__ == "__main__":
    main(sys.argv[1] if len(sys.argv) > 1 else "tank-run")
