"""Curves over time: the energy ledger, gauges, motions and loads, the balance of hand-off boxes."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from bemwave.records.energy import Ledger
from bemwave.records.series import MODES
from bemwave.report.colours import light
from bemwave.report.figures import Figure, drawn
from bemwave.report.series import Bodies, Delivery, Gauge
from bemwave.report.words import number

Array = npt.NDArray[np.float64]

GAUGES_TOGETHER = 4  # in one figure

_FORCE_NAMES = {
    "force": ("in all", "ink", "-"),
    "force_incident": ("incident waves", "line1", "-"),
    "force_scattered": ("scattered waves", "line2", "-"),
    "force_radiated": ("own motion", "line3", "-"),
    "force_restoring": ("restoring", "line4", "--"),
}


def ledger_figure(ledger: Ledger, folder: Path) -> Figure:
    """Energy of the solved waves: put in, still there, taken by the absorber, missing."""
    times, missing = ledger.times, 100.0 * ledger.missing
    scale, unit = _scale(float(max(ledger.came_in.max(), ledger.energy.max())), "J")

    def draw(sheet: Any) -> None:
        upper, lower = sheet.subplots(2, 1, sharex=True, height_ratios=(3, 1))
        upper.plot(times, ledger.came_in / scale, color=light("line2"), label="put in")
        upper.plot(times, ledger.energy / scale, color=light("line1"), label="in the water")
        upper.plot(times, ledger.taken / scale, color=light("line3"), label="absorbed")
        upper.set(ylabel=f"energy, {unit}")
        lower.plot(times, missing, color=light("ink"))
        lower.set(xlabel="time, s", ylabel="missing, %")
        sheet.legend(loc="outside upper left", ncols=3)

    return drawn(
        "energy",
        "Energy of the solved waves: what bodies, walls and patches put in is either still in the "
        "water or in the absorber. What is missing is shown below, in per cent of the largest.",
        f"At most {np.abs(missing).max():.2g} % is missing.",
        draw,
        folder,
        3.3,
    )


def gauge_figures(gauges: Sequence[Gauge], since: float, folder: Path) -> Iterator[Figure]:
    """Levels at gauges, and of the incident waves alone; a few gauges under each other."""
    for start in range(0, len(gauges), GAUGES_TOGETHER):
        yield _gauges(start, gauges[start : start + GAUGES_TOGETHER], since, folder)


def _gauges(start: int, gauges: Sequence[Gauge], since: float, folder: Path) -> Figure:
    def draw(sheet: Any) -> None:
        rows = sheet.subplots(len(gauges), 1, sharex=True, sharey=True, squeeze=False)[:, 0]
        for position, (axes, gauge) in enumerate(zip(rows, gauges, strict=True), start + 1):
            axes.plot(gauge.times, gauge.incident, color=light("line2"), lw=0.9, label="incident")
            axes.plot(gauge.times, gauge.elevation, color=light("line1"), label="in all")
            _since(axes, since, gauge.times)
            axes.set_title(f"{position}: {gauge.name}", loc="left")
            axes.set(ylabel="elevation, m")
        rows[-1].set(xlabel="time, s")
        sheet.legend(*rows[0].get_legend_handles_labels(), loc="outside upper left", ncols=2)

    return drawn(
        f"gauges-{start // GAUGES_TOGETHER + 1}",
        "The level at gauges, and what it would be of the incident waves alone.",
        "Their figures are in the table.",
        draw,
        folder,
        1.0 + 1.35 * len(gauges),
    )


def load_figures(
    place: int, name: str, bodies: Bodies, since: float, folder: Path
) -> Iterator[Figure]:
    """Forces and moments on one body; none of one that rides the surface."""
    if not np.isfinite(bodies.forces["force"][:, place]).any():
        return
    parts = {key: values[:, place] for key, values in bodies.forces.items() if key in _FORCE_NAMES}
    parts = {key: values for key, values in parts.items() if np.nan_to_num(values).any()}
    for first, kind, unit in ((0, "forces", "N"), (3, "moments", "N m")):
        modes = range(first, first + 3)
        largest = max((np.nanmax(np.abs(v[:, modes])) for v in parts.values()), default=0.0)
        scale, prefixed = _scale(float(largest), unit)
        rows = {k: v[:, modes] / scale for k, v in parts.items()}
        yield _three(
            f"{kind}-{place + 1}",
            f"{kind.capitalize()} of the water on {name}, about its centre of mass, in its axes.",
            bodies.times,
            rows,
            [f"{MODES[m]}, {prefixed}" for m in modes],
            since,
            folder,
            "The largest values are in the table.",
        )


def motion_figures(
    place: int, name: str, bodies: Bodies, since: float, folder: Path
) -> Iterator[Figure]:
    """Motions of one body, where it moves."""
    motion = bodies.motion[:, place]
    late = np.abs(motion[bodies.times >= since])
    for first, kind, unit in ((0, "shifts", "m"), (3, "turns", "degrees")):
        modes = range(first, first + 3)
        if np.nan_to_num(motion[:, modes]).any():
            yield _three(
                f"{kind}-{place + 1}",
                f"How {name} moves from its mean position: {kind}.",
                bodies.times,
                {"force": motion[:, modes]},
                [f"{MODES[m]}, {unit}" for m in modes],
                since,
                folder,
                f"Up to {number(float(np.nanmax(late[:, modes], initial=0.0)))} {unit}.",
            )


def _three(
    name: str,
    caption: str,
    times: Array,
    rows: Mapping[str, Array],
    labels: Sequence[str],
    since: float,
    folder: Path,
    told: str,
) -> Figure:
    """Three rows over one time axis, each with the same lines."""

    def draw(sheet: Any) -> None:
        for k, axes in enumerate(sheet.subplots(3, 1, sharex=True)):
            for key, values in rows.items():
                label, colour, dash = _FORCE_NAMES[key]
                style = {"color": light(colour), "linestyle": dash}
                width = 1.5 if key == "force" else 0.9
                axes.plot(times, values[:, k], label=label, linewidth=width, **style)
            _since(axes, since, times)
            axes.set(ylabel=labels[k])
        axes.set(xlabel="time, s")
        if len(rows) > 1:
            handles, texts = axes.get_legend_handles_labels()
            sheet.legend(handles, texts, loc="outside upper left", ncols=3)

    return drawn(name, caption, told, draw, folder, 4.2)


def balance_figure(delivery: Delivery, folder: Path) -> Figure:
    """What flows out of a box, and how its volume grows: they must add up to nothing."""
    assert delivery.balance is not None
    flux, rate = delivery.balance["net_flux"], delivery.balance["volume_rate"]
    largest = float(np.max(delivery.balance["largest_face_flux"], initial=0.0)) or 1.0
    missing = 100.0 * (flux + rate) / largest

    def draw(sheet: Any) -> None:
        upper, lower = sheet.subplots(2, 1, sharex=True, height_ratios=(3, 1))
        upper.plot(delivery.times, -flux, color=light("line1"), linewidth=3.0, label="flows in")
        upper.plot(delivery.times, rate, "--", color=light("line2"), label="volume grows")
        upper.set(ylabel="rate, m\u00b3/s")
        lower.plot(delivery.times, missing, color=light("ink"))
        lower.set(xlabel="time, s", ylabel="off, %")
        sheet.legend(loc="outside upper left", ncols=2)

    return drawn(
        f"closure-{delivery.name}",
        f"Closure of {delivery.name}: what flows in through the faces against the growth of the "
        "water inside. Below, what is off, in per cent of the largest flux through one face.",
        f"At most {np.max(np.abs(missing), initial=0.0):.2g} % is off.",
        draw,
        folder,
        3.3,
    )


def delivery_figure(delivery: Delivery, folder: Path) -> Figure:
    """How fast the water is at a hand-off, and between which levels it stands."""

    def draw(sheet: Any) -> None:
        upper, lower = sheet.subplots(2, 1, sharex=True)
        upper.plot(delivery.seen, delivery.fastest, color=light("line1"))
        upper.set(ylabel="speed, m/s")
        upper.set_ylim(bottom=0.0)
        lower.fill_between(
            delivery.seen, delivery.lowest, delivery.highest, color=light("line1"), alpha=0.35
        )
        lower.set(xlabel="time, s", ylabel="surface, m")

    return drawn(
        f"field-{delivery.name}",
        f"What {delivery.name} hands over: the fastest water at any of its points, and the levels "
        "between which its surface stands.",
        f"Up to {np.nanmax(delivery.fastest, initial=0.0):.2f} m/s.",
        draw,
        folder,
        2.9,
    )


def _since(axes: Any, since: float, times: Array) -> None:
    """Shade the start-up, before the record can be trusted."""
    if len(times) and since > times[0]:
        axes.axvspan(times[0], min(since, times[-1]), color=light("rule"), alpha=0.45, linewidth=0)
    axes.margins(x=0.0)


def _scale(largest: float, unit: str) -> tuple[float, str]:
    """A factor and the unit with its prefix, so that figures stay below a thousand or so."""
    for factor, prefix in ((1e9, "G"), (1e6, "M"), (1e3, "k")):
        if largest >= factor:
            return factor, prefix + unit
    return 1.0, unit
