"""What does the water do? The moving sea, maps of it, gauges."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import numpy as np

from bemwave.report.content import Block, Figures, Material, Sea, Section, Table
from bemwave.report.curves import gauge_figures
from bemwave.report.figures import Figure
from bemwave.report.film import Film, film_of
from bemwave.report.maps import elevation_maps, height_map, scattered_map
from bemwave.report.water import water_json
from bemwave.report.words import number

SEEN = 0.012  # of the water's diagonal: how high a wave looks at first; hulls are drawn out with it


def sea(material: Material) -> Section:
    """The section on the water."""
    film = material.film
    if film is None:
        answer = "There is no record of it yet."
        return Section("sea", "What does the water do?", "no record yet", answer, [])
    blocks: list[Block] = [_view(material, film), Figures(list(_maps(material, film)))]
    if material.gauges:
        blocks.append(_gauge_table(material))
        figures = gauge_figures(material.gauges, material.since, material.folder)
        blocks.append(Figures(list(figures)))
    late = film.after(material.since)
    crest = float(np.nanmax(late.total, initial=0.0))
    trough = float(np.nanmin(late.total, initial=0.0))
    short = f"crests to {number(crest, 2)} m"
    answer = (
        f"From t = {number(float(late.times[0]))} s on the surface stands between "
        f"{number(trough, 2)} and {number(crest, 2)} m about still water{_heights(late)}."
    )
    return Section("sea", "What does the water do?", short, answer, blocks)


def _heights(film: Film) -> str:
    if len(film.times) < 3 or not film.wet.any():
        return ""
    heights = 4.0 * film.total[:, film.wet].std(axis=0)
    low, high = np.percentile(heights, [5, 95])
    between = f"{number(float(low), 2)} to {number(float(high), 2)} m"
    return f"; its waves are {between} high in most places"


def _view(material: Material, film: Film) -> Sea:
    reach = math.hypot(np.ptp(film.x), np.ptp(film.y))
    wanted = SEEN * reach / material.limit
    exaggeration = int(np.clip(round(wanted), 1, 10))
    first = int(np.searchsorted(film.times, material.since))
    return Sea(
        data=water_json(material.run, film, material.limit, material.bodies),
        limit=material.limit,
        times=film.times.tolist(),
        first=min(first, len(film.times) - 1),
        exaggeration=exaggeration,
        notes=list(_view_notes(material, film)),
    )


def _view_notes(material: Material, film: Film) -> Iterator[str]:
    yield (
        f"A place every {number(max(film.spacing), 2)} m, of the run's own field. Heights, hulls "
        "too, are drawn as many times too high as the slider says."
    )
    if film.times[0] > material.run.times[0]:
        yield (
            f"The page holds the last {len(film.times)} frames, from t = "
            f"{number(float(film.times[0]))} s on."
        )
    if material.run.hulls:
        yield (
            "Hulls: red under still water, as solved. The grey walls above are only drawn: the "
            "solver knows no shape there."
        )
    if material.run.riders:
        names = ", ".join(hull.name for hull in material.run.riders)
        yield f"Only riding the surface, making no waves: {names}."
    period = material.run.manifest.peak_period
    interval = float(np.diff(film.times).max()) if len(film.times) > 1 else 0.0
    if interval > period / 8.0:
        yield (
            f"Records are {number(interval)} s apart, too far to follow waves of "
            f"{number(period)} s: see the frames as single pictures, and write a smaller "
            "record_every to see them move."
        )


def _maps(material: Material, film: Film) -> Iterator[Figure]:
    run, folder, late = material.run, material.folder, film.after(material.since)
    times = np.array(material.times or _instants(late))
    yield from elevation_maps(run, film_of(run, times), material.limit, folder)
    if run.history is not None:
        yield scattered_map(run, film, folder)
    if len(late.times) > 2:
        yield height_map(run, late, folder)


def _instants(film: Film) -> Sequence[float]:
    """Two times to map: that of the highest crest, and the last."""
    crests = np.nan_to_num(film.total, nan=-math.inf).max(axis=(1, 2))
    highest, last = float(film.times[int(np.argmax(crests))]), float(film.times[-1])
    return [last] if highest == last else [highest, last]


def _gauge_table(material: Material) -> Table:
    rows = []
    for position, gauge in enumerate(material.gauges, 1):
        since = material.shown(gauge.times)
        level, incident, gap = gauge.elevation[since], gauge.incident[since], gauge.gap[since]
        dry = not np.isfinite(level).any()
        figures = (
            ["-"] * 5
            if dry
            else [
                number(4.0 * float(np.std(level))),
                number(4.0 * float(np.std(incident))),
                number(float(level.max())),
                number(float(level.min())),
                number(float(gap.min())) if np.isfinite(gap).any() else "-",
            ]
        )
        rows.append((f"{position}: {gauge.name}", *figures))
    head = (
        "gauge",
        "height of the waves, m",
        "of the incident alone, m",
        "highest, m",
        "lowest, m",
        "least gap to the deck, m",
    )
    caption = (
        f"Gauges from t = {number(material.since)} s on. Heights are four standard deviations; a "
        "gauge inside a waterline reads nothing."
    )
    return Table(caption, head, rows)
