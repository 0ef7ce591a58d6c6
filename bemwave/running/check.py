"""`bemwave check`: the verdicts again, and on request the run against one of coarser panels."""

from __future__ import annotations

import os
import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np

from bemwave.case import Case
from bemwave.checks import judge
from bemwave.checks.verdicts import PRACTICE, judged
from bemwave.errors import InputError
from bemwave.records import Run, RunFolder, Verdict, open_run, refuse_links, write_checks
from bemwave.running.loop import solve
from bemwave.running.sea import scattered_sea
from bemwave.running.survey import survey

COARSER = 1.5
LIMIT = 0.10


def check(path: str | os.PathLike[str], *, convergence: bool = False) -> list[Verdict]:
    """Judge a finished run and write its checks.json again.

    Parameters
    ----------
    path : the run folder.
    convergence : solve the case again at 1.5 x spacing and compare.

    Raises
    ------
    InputError
        If there is no run, a file of it was changed since, or it cannot be solved again.
    """
    run = open_run(Path(path))
    refuse_links(run.folder)
    run.refuse_changed_files()
    verdicts = judge(run)
    if convergence:
        verdicts.append(_convergence(run))
    write_checks(verdicts, run.folder.checks)
    return verdicts


def _convergence(run: Run) -> Verdict:
    """Root mean square difference of the total elevation between the two, over the finer's.

    The bodies scatter the same waves in both, also those with too few of the larger panels.
    """
    if run.history is None:
        return Verdict("convergence", 0.0, None, "info", "the sea alone: no panels")
    surface, home = run.case.surface, Path(run.manifest.notes["case_folder"])
    try:
        surveyed = survey(coarser(run.case.placed(home), run.manifest.route))
    except InputError as error:
        raise InputError(
            f"--convergence solves the case again with {COARSER} times its sizes, and then: {error}"
        ) from error
    scattered, share = scattered_sea(surveyed.sea, surface.spacing)
    surveyed = replace(surveyed, scattered=scattered, unscattered_share=share)
    with tempfile.TemporaryDirectory(prefix="bemwave-") as folder:
        coarse = solve(surveyed, RunFolder(Path(folder) / "run"))
        region, side = run.case.run.history_region, np.linspace(-0.45, 0.45, 15)
        centre = surface.centre if region is None else region.centre
        size = surface.extent if region is None else region.size
        x, y = np.meshgrid(centre[0] + side * size[0], centre[1] + side * size[1])
        inside = np.vectorize(surface.contains)(x, y)
        times = run.times[len(run.times) // 2 :]
        fine = run.elevation(x[inside], y[inside], times)
        difference = coarse.elevation(x[inside], y[inside], times) - fine
    figure = float(np.sqrt(np.nanmean(difference**2) / np.nanmean(fine**2)))
    return judged("convergence", figure, LIMIT, f"against {COARSER} x spacing; limit {PRACTICE}")


def coarser(case: Case, route: str) -> Case:
    """The same case and route, 1.5 times as coarse, without hand-offs and frames."""
    tables = case.model_dump(exclude_unset=True, exclude_none=True)
    for key in ("handoff", "frames", "gauge"):
        tables.pop(key, None)
    surface = tables["surface"]
    surface.pop("mesh", None)
    surface["route"] = route
    tables["run"].pop("history_region", None)
    for key in ("spacing", "fine_spacing"):
        if key in surface:
            surface[key] *= COARSER
    for body in tables.get("body", ()):
        if "panel_size" in body:
            body["panel_size"] *= COARSER
    return Case(**tables).placed(case.folder)
