"""The loop of a run: survey, assemble, step, and hand each state to the outputs that want it."""

from __future__ import annotations

import os
import platform
import time as clock
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager, suppress
from dataclasses import replace
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
from numba import get_num_threads

from bemwave import __version__
from bemwave.case import Case
from bemwave.checks import judge
from bemwave.errors import InputError, RunError
from bemwave.flow.sheet import Sheet
from bemwave.flow.state import SurfaceState
from bemwave.geometry.surface_mesh import joined
from bemwave.geometry.vtp_files import write_vtp
from bemwave.records import (
    Manifest,
    Rest,
    Run,
    RunFolder,
    alone_in,
    checksums,
    create_folder,
    read_manifest,
    refuse_used_folder,
    whole,
    write_checks,
    write_manifest,
)
from bemwave.records.manifest import Status
from bemwave.running.faults import refuse_no_numbers, where
from bemwave.running.forecast import forecasts, trustworthy_from
from bemwave.running.frames_output import note_on, shares
from bemwave.running.interrupts import heard
from bemwave.running.outputs import EnergyOutput, Output, outputs_of
from bemwave.running.progress import kept_in, log, progress
from bemwave.running.resuming import refuse_changed, restore, save, tell_what_changed
from bemwave.running.sampling import refuse_unfit
from bemwave.running.solution import Solution, nothing_solved, products
from bemwave.running.survey import Survey, survey
from bemwave.waves import write_sea

Array = npt.NDArray[np.float64]


def run(case: Case, out: str | os.PathLike[str], *, resume: bool = False) -> Run:
    """Solve a case and write its run folder.

    The folder is made when the case has been surveyed and its matrices stand: what can be refused
    has been refused by then. Ctrl-C and SIGTERM leave a checkpoint behind and end in
    KeyboardInterrupt.

    Parameters
    ----------
    case : Case
    out : path
        The run folder; made, or with `resume` gone on with.
    resume : bool
        Go on from the last checkpoint in the folder; from the start if there is none.

    Returns
    -------
    Run
        The finished run, opened.

    Raises
    ------
    InputError, NotYetError, MissingLibraryError
        Before anything is written.
    RunError
        If the run cannot go on.

    Examples
    --------
    >>> run = bemwave.run(bemwave.read_case("case.toml"), "out")    # doctest: +SKIP
    >>> run.elevation(0.0, 0.0, run.times).max()                    # doctest: +SKIP
    1.83
    """
    folder = RunFolder(Path(out))
    if not (resume and folder.holds_run):
        _refuse_folder(folder)
        return solve(survey(case), folder)
    before = read_manifest(folder.manifest)
    if before.status == "finished":
        log.info(f"{folder.path} holds a finished run: nothing is left to do")
        return Run(folder.path)
    with alone_in(folder):
        refuse_changed(case, folder, before)
    return solve(survey(case), folder, before)


def solve(surveyed: Survey, folder: RunFolder, before: Manifest | None = None) -> Run:
    """Solve a surveyed case, as `run` does, in a folder that it can go into.

    `before`: of the run to go on with; None starts anew.
    """
    with products(surveyed):
        return _solve(surveyed, folder, before)


def _solve(surveyed: Survey, folder: RunFolder, before: Manifest | None) -> Run:
    started = clock.monotonic()
    refuse_unfit(surveyed)
    solution = _assemble(surveyed)
    with _told(solution, folder):
        if before is None:
            create_folder(folder.path, surveyed.case.text)
        with alone_in(folder), kept_in(folder.log), heard() as interrupted:
            if before is None:
                refuse_used_folder(folder.path)  # another may have begun there meanwhile
            manifest = _begin(surveyed, solution, folder, before)
            with _ending(manifest, folder):
                log.info(f"set up in {clock.monotonic() - started:.1f} s")
                kept = None if before is None else restore(solution, folder)
                outputs = outputs_of(surveyed, solution, folder, kept)
                _loop(surveyed, solution, outputs, folder, interrupted)
                log.info(f"solved after {clock.monotonic() - started:.1f} s")
                write_checks(judge(Run(folder.path)), folder.checks)
    return Run(folder.path)


def _refuse_folder(folder: RunFolder) -> None:
    """Raise InputError where a new run cannot go: told before the work, not after it."""
    refuse_used_folder(folder.path)
    there = next(path for path in (folder.path, *folder.path.absolute().parents) if path.exists())
    if not (there.is_dir() and os.access(there, os.W_OK)):
        raise InputError(
            f"{folder.path} cannot be made, for {there} is no folder that can be written to; "
            "expected one: name another with --out"
        )


def _assemble(surveyed: Survey) -> Solution | None:
    if surveyed.mesh is None:
        return None
    with progress("assembling") as report:
        return Solution(surveyed, report)


def _begin(
    surveyed: Survey, solution: Solution | None, folder: RunFolder, before: Manifest | None
) -> Manifest:
    """Write what is known before the first step."""
    case = surveyed.case
    mesh = surveyed.water if surveyed.mesh is None else surveyed.mesh
    route, reason = surveyed.route
    notes = {"case_folder": str(case.folder.resolve()), **forecasts(surveyed)}
    if case.frames is not None:
        notes |= {"frames": note_on(surveyed), **shares(surveyed)}
    if solution is not None:
        notes["trustworthy_from"] = trustworthy_from(surveyed)
        notes["matrix_symmetry"] = solution.flow.asymmetry()
    manifest = Manifest(
        inputs=checksums(case.folder, case.files),
        threads=get_num_threads(),
        route=route,
        reason=reason,
        closed=surveyed.closed,
        mirrors=tuple((m.axis, m.position) for m in surveyed.mirrors),
        sheet=None if surveyed.sheet is None else _corner(surveyed.sheet),
        part_names=mesh.part_names,
        shortest_period=surveyed.periods.kept,
        peak_period=surveyed.periods.peak,
        bodies={hull.name: Rest.of(hull) for hull in surveyed.hulls},
        riders={hull.name: Rest.of(hull) for hull in surveyed.riders},
        notes=notes,
    )
    with whole(folder.mesh) as beside:
        write_vtp(mesh, beside)
    if surveyed.riders:
        with whole(folder.riders) as beside:
            write_vtp(joined([hull.mesh for hull in surveyed.riders]), beside)
    with whole(folder.sea) as beside:
        write_sea(surveyed.sea, beside)
    if before is not None:
        tell_what_changed(before, manifest)
        gone_on = [*before.notes.get("gone_on", []), manifest.started]
        manifest = replace(manifest, started=before.started, notes={**notes, "gone_on": gone_on})
    write_manifest(manifest, folder.manifest)
    log.info(f"bemwave {__version__}, process {os.getpid()} on {platform.node()}")
    log.info(f"route {route}: {reason}")
    return manifest


def _corner(sheet: Sheet) -> dict[str, Any]:
    """A grid as the manifest tells it."""
    return {name: getattr(sheet, name) for name in ("west", "south", "spacing", "shape")}


@contextmanager
def _told(solution: Solution | None, folder: RunFolder) -> Iterator[None]:
    """Raise RunError in place of a disk's, a file library's or the memory's own errors."""
    try:
        yield
    except MemoryError as error:
        raise RunError(
            f"the machine has no memory left {where(solution)}; expected what bemwave plan "
            "forecasts: close other programs, then go on with --resume"
        ) from error
    except (OSError, RuntimeError) as error:  # netCDF's own errors are RuntimeErrors
        reason = " ".join(str(error).split())[:300]  # some libraries tell at length
        raise RunError(
            f"{folder.path} could not be written any further {where(solution)} ({reason}); "
            "expected room and a disk that answers and may be written to: see to that, then go on "
            "with --resume; what was written is whole"
        ) from error


@contextmanager
def _ending(manifest: Manifest, folder: RunFolder) -> Iterator[None]:
    """Write how the run ended into its manifest, whatever happens inside."""
    status: Status = "failed"
    files: dict[str, str] = {}
    try:
        yield
        files, status = _checksums(folder), "finished"
    except KeyboardInterrupt:
        status = "interrupted"
        raise
    finally:
        with suppress(OSError):  # on a full disk the first error is the one to tell
            write_manifest(replace(manifest.with_status(status), files=files), folder.manifest)


def _checksums(folder: RunFolder) -> dict[str, str]:
    """SHA-256 of all that a run wrote, but for what changes after it."""
    left_out = {folder.manifest, folder.log, folder.checks, folder.page, *folder.figures.glob("*")}
    files = (path for path in folder.path.rglob("*") if path.is_file() and path not in left_out)
    return checksums(folder.path, sorted(str(path.relative_to(folder.path)) for path in files))


def _loop(
    surveyed: Survey,
    solution: Solution | None,
    outputs: dict[str, Output],
    folder: RunFolder,
    interrupted: Callable[[], bool],
) -> None:
    """Visit every instant that an output wants, in order."""
    settings, saved, since = surveyed.case.run, clock.monotonic(), clock.time()
    with progress("solving") as report, _flushed(outputs):
        for state, wanting in _visits(solution, outputs):
            refuse_no_numbers(state, solution)
            for output in wanting:
                output.write(state)
            report(state.time / settings.duration, partial(_figure, state, outputs))
            if interrupted() or clock.monotonic() - saved > settings.checkpoint_every:
                begun = clock.time()
                save(solution, outputs, folder, state.time, since)
                saved, since = clock.monotonic(), begun
            if interrupted():
                log.info(f"interrupted at t = {state.time:.6g} s, with a checkpoint")
                raise KeyboardInterrupt


@contextmanager
def _flushed(outputs: dict[str, Output]) -> Iterator[None]:
    """Put on the disk what was given, at the end, and what was sound before a field went wrong."""
    try:
        yield
    except RunError:
        for output in outputs.values():
            output.flush()
        raise
    for output in outputs.values():
        output.flush()


def _visits(
    solution: Solution | None, outputs: dict[str, Output]
) -> Iterator[tuple[SurfaceState, list[Output]]]:
    """States at the instants still to be written, each with the outputs that want it."""
    while True:
        ahead = [o.times[o.count] for o in outputs.values() if o.count < len(o.times)]
        if not ahead:
            return
        time = float(min(ahead))
        # instants of different outputs that differ by rounding are one
        wanting = [
            o
            for o in outputs.values()
            if o.count < len(o.times) and o.times[o.count] - time < 1e-9 * max(1.0, time)
        ]
        if solution is None:
            yield nothing_solved(time), wanting
        else:
            solution.advance_to(time)
            yield solution.state(time), wanting


def _figure(state: SurfaceState, outputs: Mapping[str, Output]) -> str:
    """What to show beside the bar: how far it is, and whether energy is kept until now."""
    figure, energy = f"t = {state.time:.1f} s", outputs.get("energy")
    if isinstance(energy, EnergyOutput) and energy.count:
        figure += f", {energy.figure}"
    return figure
