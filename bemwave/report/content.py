"""The parts a page is made of, and the run's material they are made from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import numpy as np
import numpy.typing as npt

from bemwave.records import Run
from bemwave.report.figures import Figure
from bemwave.report.film import Film, film_of, frame_times
from bemwave.report.series import Bodies, Delivery, Gauge, bodies_of, deliveries_of, gauges_of


@dataclass(frozen=True)
class Table:
    """A table with a heading over each column; each row's first cell names it."""

    caption: str
    head: Sequence[str]
    rows: Sequence[Sequence[str]]
    kind: str = "table"


@dataclass(frozen=True)
class Figures:
    """Figures side by side where there is room."""

    figures: Sequence[Figure]
    kind: str = "figures"


@dataclass(frozen=True)
class Notes:
    """Sentences."""

    lines: Sequence[str]
    kind: str = "notes"


@dataclass(frozen=True)
class Sea:
    """The 3-D view: its data, its colour scale's ends, times and what to say beside it."""

    data: str
    limit: float
    times: Sequence[float]
    first: int
    exaggeration: int
    notes: Sequence[str]
    kind: str = "sea"


@dataclass(frozen=True)
class Source:
    """A text as it is, folded away under its title."""

    title: str
    text: str
    kind: str = "source"


Array = npt.NDArray[np.float64]
Block = Table | Figures | Notes | Sea | Source


@dataclass(frozen=True)
class Section:
    """One question of the reader, its answer in a sentence, and what the answer stands on."""

    key: str
    question: str
    short: str
    answer: str
    blocks: Sequence[Block]


@dataclass(frozen=True)
class Material:
    """What the sections are made from: each file of the run is read once.

    Attributes
    ----------
    run : the run.
    folder : where figures go as PNG.
    times : s, chosen for the elevation maps; none chosen, none here.
    """

    run: Run
    folder: Path
    times: Sequence[float] = ()

    @cached_property
    def film(self) -> Film | None:
        """The surface over time; None where there is no record yet."""
        times = frame_times(self.run.times, self.run.manifest.peak_period)
        return film_of(self.run, times) if len(times) else None

    @cached_property
    def gauges(self) -> list[Gauge]:
        """The gauges."""
        return gauges_of(self.run)

    @cached_property
    def bodies(self) -> Bodies | None:
        """Motions and loads."""
        return bodies_of(self.run)

    @cached_property
    def deliveries(self) -> list[Delivery]:
        """The hand-offs."""
        return list(deliveries_of(self.run))

    @cached_property
    def trusted(self) -> float:
        """When solved waves have crossed the useful water, s."""
        return float(self.run.manifest.notes.get("trustworthy_from", 0.0))

    @cached_property
    def reached(self) -> float:
        """The last record's time, s."""
        return float(self.run.times[-1]) if len(self.run.times) else 0.0

    @cached_property
    def since(self) -> float:
        """From when figures are taken, s: the whole record where all of it is start-up."""
        return self.trusted if self.trusted < self.reached else 0.0

    def shown(self, times: Array) -> npt.NDArray[np.bool_]:
        """Which times of a series figures are taken from: all, where the series ends too early."""
        late = times >= self.since
        return late if late.any() else np.ones(len(times), dtype=bool)

    @cached_property
    def limit(self) -> float:
        """Largest size of the elevation from then on, m: the end of its colour scale."""
        assert self.film is not None
        late = self.film.total[self.shown(self.film.times)]
        return float(np.nanmax(np.abs(late), initial=0.0)) or self.film.peak
