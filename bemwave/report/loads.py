"""What are the loads? Forces and moments of the water on each body, and how it moves."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from bemwave.records.series import MODES
from bemwave.report.content import Block, Figures, Material, Section, Table
from bemwave.report.curves import load_figures, motion_figures
from bemwave.report.figures import Figure
from bemwave.report.series import Bodies
from bemwave.report.words import number

QUESTION = "What are the loads?"


def loads(material: Material) -> Section:
    """The section on motions and loads."""
    bodies = material.bodies
    if bodies is None or not len(bodies.times):
        short = "no bodies" if not material.run.case.body else "none yet"
        answer = "There are no bodies." if short == "no bodies" else "None are recorded yet."
        return Section("loads", QUESTION, short, answer, [])
    blocks: list[Block] = []
    for place, name in enumerate(bodies.names):
        if np.isfinite(bodies.forces["force"][:, place]).any():
            blocks.append(_table(material, bodies, place, name))
        blocks.append(Figures(list(_figures(material, bodies, place, name))))
    since = material.shown(bodies.times)
    size = np.abs(bodies.forces["force"][since][:, :, :3])
    if not np.isfinite(size).any():
        answer = "Bodies that ride the surface have motions alone: no loads are reckoned on them."
        return Section("loads", QUESTION, "no loads", answer, blocks)
    _, body, mode = np.unravel_index(int(np.nanargmax(size)), size.shape)
    largest = f"{number(float(np.nanmax(size)) / 1e3)} kN"
    answer = (
        f"The largest force is {largest}, in {MODES[mode]} on {bodies.names[body]}, from t = "
        f"{number(material.since)} s on. Pressure loads of linear theory, about each centre of "
        "mass and along the body's axes; weight and buoyancy at rest are left out."
    )
    return Section("loads", QUESTION, f"up to {largest}", answer, blocks)


def _figures(material: Material, bodies: Bodies, place: int, name: str) -> Iterator[Figure]:
    yield from load_figures(place, name, bodies, material.since, material.folder)
    yield from motion_figures(place, name, bodies, material.since, material.folder)


def _table(material: Material, bodies: Bodies, place: int, name: str) -> Table:
    since = material.shown(bodies.times)
    force, motion = bodies.forces["force"][since, place], bodies.motion[since, place]
    rows = []
    for mode, label in enumerate(MODES):
        unit, own = ("kN", "m") if mode < 3 else ("kN m", "degrees")
        load = force[:, mode] / 1e3
        rows.append(
            (
                label,
                f"{number(float(load.max()))} {unit}",
                f"{number(float(load.min()))} {unit}",
                f"{number(float(load.std()))} {unit}",
                f"{number(float(np.abs(motion[:, mode]).max()))} {own}",
            )
        )
    head = ("mode", "highest load", "lowest load", "standard deviation", "largest motion")
    return Table(f"{name}, from t = {number(material.since)} s on.", head, rows)
