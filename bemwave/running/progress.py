"""Progress of a run: a bar with the time left on a terminal, and lines in the run's log."""

from __future__ import annotations

import sys
import time as clock
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Protocol


class Report(Protocol):
    """Takes the share of a stage that is done."""

    def __call__(self, share: float, figure: str = "") -> None:
        """`share` 0 to 1; `figure` a short text shown beside it."""


@contextmanager
def progress(stage: str, log: Path) -> Iterator[Report]:
    """Show one stage on the terminal, if there is one, and note it in the log when it is over."""
    started = clock.monotonic()
    if sys.stderr.isatty():
        with _bar(stage) as report:
            yield report
    else:
        yield lambda share, figure="": None
    note(f"{stage}: {clock.monotonic() - started:.1f} s", log)


def note(line: str, log: Path) -> None:
    """Add a line to the log."""
    with log.open("a", encoding="utf-8") as file:
        file.write(line + "\n")


@contextmanager
def _bar(stage: str) -> Iterator[Report]:
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

    columns = (
        TextColumn("{task.description:<12}"),
        BarColumn(),
        TextColumn("{task.percentage:>3.0f} %"),
        TimeRemainingColumn(),
        TextColumn("{task.fields[figure]}"),
    )
    with Progress(*columns, console=Console(stderr=True)) as bars:
        task = bars.add_task(stage, total=1.0, figure="")

        def report(share: float, figure: str = "") -> None:
            bars.update(task, completed=share, figure=figure)

        yield report
