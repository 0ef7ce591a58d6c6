"""What does my box get? Each hand-off: what is in its file, and how well it closes."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np

from bemwave.case.output import Handoff
from bemwave.handoff import closure_figure
from bemwave.report.content import Block, Figures, Material, Section, Table
from bemwave.report.curves import balance_figure, delivery_figure
from bemwave.report.figures import Figure
from bemwave.report.series import Delivery
from bemwave.report.words import number, percent

QUESTION = "What does my box get?"


def boxes(material: Material) -> Section:
    """The section on hand-offs."""
    deliveries = [d for d in material.deliveries if len(d.times)]
    if not deliveries:
        asked = bool(material.run.case.handoff)
        answer = (
            "Nothing yet: its first instant is still to come."
            if asked
            else "The case asks for no hand-off: add a [[handoff]] with a box or a list of points."
        )
        return Section("box", QUESTION, "nothing yet" if asked else "no hand-off", answer, [])
    blocks: list[Block] = [_table(material, deliveries)]
    blocks.append(Figures(list(_figures(material, deliveries))))
    worst = max((_closure(d) for d in deliveries if d.balance is not None), default=None)
    fastest = max(float(np.nanmax(d.fastest, initial=0.0)) for d in deliveries)
    flows = f"Velocity, pressure and level at every instant, water of up to {number(fastest)} m/s"
    if worst is None:
        return Section("box", QUESTION, f"up to {number(fastest)} m/s", f"{flows}.", blocks)
    answer = (
        f"{flows}; {percent(worst)} of the largest flux through a face is missing in the balance."
    )
    return Section("box", QUESTION, f"{percent(worst)} off in balance", answer, blocks)


def _closure(delivery: Delivery) -> float:
    assert delivery.balance is not None
    terms = ("net_flux", "volume_rate", "largest_face_flux")
    return closure_figure(*(delivery.balance[term] for term in terms))


def _figures(material: Material, deliveries: list[Delivery]) -> Iterator[Figure]:
    for delivery in deliveries:
        if len(delivery.times) > 1:
            if delivery.balance is not None:
                yield balance_figure(delivery, material.folder)
            yield delivery_figure(delivery, material.folder)


def _table(material: Material, deliveries: list[Delivery]) -> Table:
    """One column for each hand-off, one row for each thing to know."""
    entries = {entry.name: entry for entry in material.run.case.handoff}
    labels = [label for label, _ in _facts(material, deliveries[0], entries)]
    columns = [dict(_facts(material, d, entries)) for d in deliveries]
    rows = [(label, *(column[label] for column in columns)) for label in labels]
    return Table("Hand-offs.", ("", *(d.name for d in deliveries)), rows)


def _facts(
    material: Material, d: Delivery, entries: Mapping[str, Handoff]
) -> Iterator[tuple[str, str]]:
    entry, said = entries[d.name], d.attributes
    interval = d.times[1] - d.times[0] if len(d.times) > 1 else 0.0
    yield "points", f"{d.points} in {d.columns} columns"
    yield "instants", f"{len(d.times)}, every {number(float(interval))} s"
    yield "times, s", f"{d.times[0]:.6g} to {d.times[-1]:.6g}"
    yield "fastest water, m/s", number(float(np.nanmax(d.fastest, initial=0.0)))
    yield "largest dynamic pressure, kPa", number(float(np.nanmax(d.pressure, initial=0.0)) / 1e3)
    levels = float(np.nanmin(d.lowest, initial=0.0)), float(np.nanmax(d.highest, initial=0.0))
    yield "levels, m", f"{number(levels[0])} to {number(levels[1])}"
    yield "closure", "-" if d.balance is None else percent(_closure(d))
    drift = None if d.balance is None else d.balance.get("level_drift")
    mean = "-" if drift is None or not len(drift) else number(1e3 * float(np.mean(drift)), 2)
    yield "drift of the mean level implied, mm/s", mean
    yield "above still water", said.get("crest_rule_meaning", entry.crest)
    yield "shortest period kept, s", _figure(said.get("shortest_period_kept_s"))
    error = said.get("linear_interpolation_error")
    yield "error of linear interpolation in time", "-" if error is None else percent(float(error))
    yield "zone, m", f"{entry.zone:g}" if entry.zone else "none"
    file = f"handoff/{d.name}.nc"
    start = f", handoff/{d.name}-start.nc" if entry.volume_at_start else ""
    yield "file", file + start


def _figure(text: str | None) -> str:
    return "-" if text is None else number(float(text))
