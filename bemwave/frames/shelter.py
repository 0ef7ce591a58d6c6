"""Where hulls shelter the water from waves too short to be solved: a picture's measure, by rays."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from bemwave.frames.sheet import Array, Bools
from bemwave.waves import Sea

RAYS = 48
BLUR = 0.2  # rad to either side, for what bends round a hull: no source, chosen by eye
STRIPS = 256  # across a hull


def shelter(plan: Array, waterlines: Sequence[Array], sea: Sea) -> Array:
    """Factor (n,) on the amplitude of a sea's waves at places (n, 2) near hulls.

    A ray stands for an equal share of the sea's energy and is stopped by a waterline that lies
    between a place and where the ray comes from; the factor is the root of the share that arrives.

    Parameters
    ----------
    plan : (n, 2) m
    waterlines : sequence of (k, 2) arrays
    sea : Sea
    """
    arrives = np.ones(len(plan))
    for angle in _rays(sea) if waterlines else ():
        stopped = np.zeros(len(plan), dtype=bool)
        for loop in waterlines:
            stopped |= _behind(plan, loop, float(angle))
        arrives -= stopped / RAYS
    return np.sqrt(np.maximum(arrives, 0.0))


def _rays(sea: Sea) -> Array:
    """Headings (RAYS,), each for an equal share of the energy, blurred."""
    mean = sea.mean_heading
    off = np.angle(np.exp(1j * (sea.heading - mean)))
    order = np.argsort(off, kind="stable")
    share = np.cumsum(sea.amplitude[order] ** 2)
    at = (np.arange(RAYS) + 0.5) / RAYS
    found = off[order][np.searchsorted(share, at * share[-1])]
    turn = np.mod(np.arange(RAYS) * 0.6180339887, 1.0)  # golden steps: evenly over each heading
    return np.asarray(mean + found + BLUR * (2.0 * turn - 1.0))


def _behind(plan: Array, loop: Array, angle: float) -> Bools:
    """Which places lie beyond a closed line, seen along a heading."""
    along, across = np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]])
    closed = np.vstack([loop, loop[:1]])
    steps = np.linspace(0.0, 1.0, STRIPS, endpoint=False)[:, None, None]
    line = (closed[:-1] + steps * np.diff(closed, axis=0)).reshape(-1, 2)
    low, width = (line @ across).min(), np.ptp(line @ across)
    strip = np.minimum((STRIPS * (line @ across - low) / width).astype(int), STRIPS - 1)
    back = np.full(STRIPS, -np.inf)
    np.maximum.at(back, strip, line @ along)
    at = np.floor(STRIPS * (plan @ across - low) / width).astype(int)
    within = (at >= 0) & (at < STRIPS)
    beyond = plan @ along > back[np.clip(at, 0, STRIPS - 1)]
    return np.asarray(within & beyond)
