"""What a near-field solver does with a hand-off: blend its own field into the far field's.

    python examples/hand_off.py

A buoy held under water in regular waves, and the far field on the faces and in the zone of a box
round it. The near-field solver is a toy here: water at rest that only the zone sets moving.
"""

import sys

import numpy as np
import xarray

import bemwave

BUOY = {"name": "buoy", "form": "sphere", "radius": 0.6, "centre_depth": 1.5, "panel_size": 0.3}
CASE = bemwave.Case(
    title="A buoy under regular waves",
    water={"depth": "deep"},
    waves=[{"kind": "regular", "height": 0.2, "period": 2.0}],
    surface={"size": [7.0, 5.0], "spacing": 0.6},
    body=[BUOY],
    run={"duration": 10.0},
    handoff=[
        {
            "name": "box",
            "box": {"size": [5.0, 4.0], "bottom": -2.5, "top": 0.5},
            "spacing": [0.4, 0.25],
            "start": 6.0,
            "zone": 1.0,
        }
    ],
)


def main(folder: str) -> tuple[float, float]:
    """Run, read, blend; returns the box's imbalance and how far the zone has brought the toy."""
    bemwave.run(CASE, folder)
    with xarray.open_dataset(f"{folder}/handoff/box.nc") as far:
        far.load()
    print(f"{far.sizes['point']} points, {far.sizes['time']} instants from t = {far.time[0]:.2f} s")
    # do the fluxes through the faces and the rise of the surface cancel?
    imbalance = float(np.abs(far.net_flux + far.volume_rate).max() / far.largest_face_flux.max())
    print(f"imbalance of the box: {100 * imbalance:.2f} % of the largest flux through a face")

    # the solver's steps are shorter than the far field's instants: linear between them
    step, near = 0.01, 0.0
    wanted = np.arange(float(far.time[0]), float(far.time[-1]), step)
    u = far.u.where(far.wet == 1.0, drop=False).fillna(0.0).interp(time=wanted)
    blend = 1.0 - np.exp(-far.zone_rate.values * step)  # the same whatever the step
    for instant in u.values:
        near = near + blend * (instant - near)
    outer = far.zone_weight.values > 0.9
    gained = np.linalg.norm(near[outer]) / np.linalg.norm(u.values[-1][outer])
    print(f"at the sides the toy has {100 * gained:.0f} % of the far field's velocity")
    return imbalance, float(gained)


if __name__ == "__main__":
    main(sys.argv[1] if len(sys.argv) > 1 else "buoy-run")
