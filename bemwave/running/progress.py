"""Progress of a run: a bar with the time left on a terminal, and lines for the run's log.

Lines go to Python's logger "bemwave"; while a run is on they are kept in its log.txt as well.
"""

from __future__ import annotations

import logging
import math
import sys
import time as clock
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Protocol

SECONDS_PER_FIGURE = 0.5

log = logging.getLogger("bemwave")
log.setLevel(logging.INFO)


class Report(Protocol):
    """Takes the share of a stage that is done."""

    def __call__(self, share: float, figure: Callable[[], str] = str) -> None:
        """`share` 0 to 1; `figure` gives a short text to show beside it, asked for now and then."""


@contextmanager
def kept_in(path: Path) -> Iterator[None]:
    """Add every line of the log to a file too, each with the time of day."""
    keeper = logging.FileHandler(path, encoding="utf-8")
    # a full disk is told by the files that matter, not in the middle of a line
    keeper.handleError = lambda record: None  # type: ignore[method-assign]
    keeper.setFormatter(logging.Formatter("%(asctime)s  %(message)s"))
    log.addHandler(keeper)
    try:
        yield
    finally:
        log.removeHandler(keeper)
        keeper.close()


@contextmanager
def progress(stage: str) -> Iterator[Report]:
    """Show one stage on the terminal, if there is one."""
    if sys.stderr.isatty():
        with _bar(stage) as report:
            yield report
    else:
        yield lambda share, figure=str: None


@contextmanager
def _bar(stage: str) -> Iterator[Report]:
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

    columns = (
        TextColumn("{task.description:<10}"),
        BarColumn(),
        TextColumn("{task.percentage:>3.0f} %"),
        TimeRemainingColumn(),
        TextColumn("{task.fields[figure]}"),
    )
    with Progress(*columns, console=Console(stderr=True)) as bars:
        task = bars.add_task(stage, total=1.0, figure="")

        told = -math.inf

        def report(share: float, figure: Callable[[], str] = str) -> None:
            nonlocal told
            bars.update(task, completed=share)
            if share >= 1.0 or clock.monotonic() - told > SECONDS_PER_FIGURE:
                bars.update(task, figure=figure())
                told = clock.monotonic()

        yield report
