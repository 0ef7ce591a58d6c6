"""The loop of a run: survey, assemble, step, and hand each state to the outputs that want it."""

from __future__ import annotations

import os
import time as clock
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path

import numpy as np
import numpy.typing as npt
from numba import get_num_threads

from bemwave.case import Case
from bemwave.checks import judge
from bemwave.errors import InputError, RunError
from bemwave.flow.state import SurfaceState
from bemwave.geometry.files import write_mesh
from bemwave.records import (
    Checkpoint,
    Manifest,
    Rest,
    Run,
    RunFolder,
    create_folder,
    hashes_of,
    latest_checkpoint,
    read_manifest,
    refuse_used_folder,
    write_checkpoint,
    write_checks,
    write_manifest,
)
from bemwave.records.manifest import Status
from bemwave.running.forecast import forecasts, trustworthy_from
from bemwave.running.interrupts import heard
from bemwave.running.outputs import Output, outputs_of
from bemwave.running.progress import kept_in, log, progress
from bemwave.running.sampling import refuse_unfit
from bemwave.running.solution import Solution, nothing_solved
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
    again = resume and folder.holds_run
    if again and read_manifest(folder.manifest).status == "finished":
        log.info(f"{folder.path} holds a finished run: nothing is left to do")
        return Run(folder.path)
    _refuse_folder(folder, case, again)
    return solve(survey(case), folder, resume)


def solve(surveyed: Survey, folder: RunFolder, resume: bool = False) -> Run:
    """Solve a surveyed case, as `run` does, in a folder that it can go into."""
    started = clock.monotonic()
    refuse_unfit(surveyed)
    solution = _assemble(surveyed)
    if not folder.holds_run:
        create_folder(folder.path, surveyed.case.text)
    with kept_in(folder.log), heard() as interrupted:
        manifest = _begin(surveyed, solution, folder)
        log.info(f"set up in {clock.monotonic() - started:.1f} s")
        with _ending(manifest, folder.manifest):
            kept = _restore(solution, folder) if resume else None
            outputs = outputs_of(surveyed, solution, folder, kept)
            _loop(surveyed, solution, outputs, folder, interrupted)
            log.info(f"solved after {clock.monotonic() - started:.1f} s")
            write_checks(judge(Run(folder.path)), folder.checks)
    return Run(folder.path)


def _refuse_folder(folder: RunFolder, case: Case, again: bool) -> None:
    """Raise InputError where this run cannot go: told before the work, not after it."""
    if not again:
        refuse_used_folder(folder.path)
    elif folder.case.read_text(encoding="utf-8") != case.text:
        raise InputError(
            f"{folder.path} holds a run of another case; expected the case it was started with: "
            "give that case, or another --out"
        )
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


def _begin(surveyed: Survey, solution: Solution | None, folder: RunFolder) -> Manifest:
    """Write what is known before the first step."""
    case = surveyed.case
    mesh = surveyed.water if surveyed.mesh is None else surveyed.mesh
    route, reason = surveyed.route
    notes = {"case_folder": str(case.folder.resolve()), **forecasts(surveyed)}
    if solution is not None:
        notes["trustworthy_from"] = trustworthy_from(surveyed)
        notes["matrix_symmetry"] = _asymmetry(solution.flow.surface_matrix)
    manifest = Manifest(
        inputs=hashes_of(_input_files(case), case.folder),
        threads=get_num_threads(),
        route=route,
        reason=reason,
        closed=surveyed.closed,
        mirrors=tuple((m.axis, m.position) for m in surveyed.mirrors),
        part_names=mesh.part_names,
        shortest_period=surveyed.periods.kept,
        peak_period=surveyed.periods.peak,
        bodies={hull.name: Rest.of(hull) for hull in surveyed.hulls},
        notes=notes,
    )
    write_mesh(mesh, folder.mesh)
    write_sea(surveyed.sea, folder.sea)
    write_manifest(manifest, folder.manifest)
    log.info(f"route {route}: {reason}")
    return manifest


def _input_files(case: Case) -> list[str]:
    named = [wave.file for wave in case.waves] + [body.mesh for body in case.body]
    named += [body.motions_file for body in case.body]
    named += [case.surface.mesh] + [handoff.points for handoff in case.handoff]
    return sorted({str(name) for name in named if name is not None})


def _asymmetry(matrix: Array) -> float:
    """Largest difference across the diagonal over the largest entry; a few rows at a time."""
    rows = [slice(start, start + 256) for start in range(0, len(matrix), 256)]
    largest = max(np.abs(matrix[row]).max() for row in rows)
    return float(max(np.abs(matrix[row] - matrix[:, row].T).max() for row in rows) / largest)


@contextmanager
def _ending(manifest: Manifest, path: Path) -> Iterator[None]:
    """Write how the run ended into its manifest, whatever happens inside.

    Raises
    ------
    RunError
        In place of a disk's or a file library's own errors.
    """
    status: Status = "failed"
    try:
        yield
        status = "finished"
    except KeyboardInterrupt:
        status = "interrupted"
        raise
    except (OSError, RuntimeError) as error:  # netCDF's own errors are RuntimeErrors
        raise RunError(
            f"{path.parent} could not be written any further ({error}); expected room and a disk "
            "that answers: see to that, then go on with --resume"
        ) from error
    finally:
        with suppress(OSError):  # on a full disk the first error is the one to tell
            write_manifest(manifest.with_status(status), path)


def _restore(solution: Solution | None, folder: RunFolder) -> Mapping[str, int] | None:
    """Put the latest checkpoint back; returns how many instants each output had by then."""
    checkpoint, damaged = latest_checkpoint(folder.checkpoint)
    for path in damaged:
        log.info(f"{path} is damaged and passed over")
    if checkpoint is None:
        log.info("there is no checkpoint to go on from: starting again")
        return None
    if solution is not None:
        solution.stepper.restore(dict(checkpoint.arrays), int(checkpoint.facts["step"]))
    log.info(f"going on from the checkpoint at t = {checkpoint.facts['time']:.6g} s")
    kept: Mapping[str, int] = checkpoint.facts["kept"]
    return kept


def _loop(
    surveyed: Survey,
    solution: Solution | None,
    outputs: dict[str, Output],
    folder: RunFolder,
    interrupted: Callable[[], bool],
) -> None:
    """Visit every instant that an output wants, in order."""
    settings, saved = surveyed.case.run, clock.monotonic()
    with progress("solving") as report:
        for state, wanting in _visits(solution, outputs):
            for output in wanting:
                output.write(state)
            _check_finite(state)
            report(state.time / settings.duration, _figure(state))
            if interrupted() or clock.monotonic() - saved > settings.checkpoint_every:
                _save(solution, outputs, folder, state.time)
                saved = clock.monotonic()
            if interrupted():
                log.info(f"interrupted at t = {state.time:.6g} s, with a checkpoint")
                raise KeyboardInterrupt
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


def _check_finite(state: SurfaceState) -> None:
    if not np.isfinite(state.elevation).all():
        raise RunError(
            f"the elevation is no longer a number at t = {state.time:.6g} s; expected it finite: "
            "what was written before is whole; check the mesh with bemwave plan, or take a "
            "smaller step"
        )


def _figure(state: SurfaceState) -> str:
    """What to show beside the bar."""
    figure = f"t = {state.time:.1f} s"
    if len(state.elevation):
        figure += f", highest solved wave {np.abs(state.elevation).max():.3g} m"
    return figure


def _save(
    solution: Solution | None, outputs: dict[str, Output], folder: RunFolder, time: float
) -> None:
    for output in outputs.values():
        output.flush()
    kept = {name: output.count for name, output in outputs.items()}
    arrays: dict[str, Array] = {} if solution is None else solution.stepper.history()
    step = 0 if solution is None else solution.stepper.count
    facts = {"time": time, "step": step, "kept": kept}
    # numbered by instants, which grow also where nothing is solved
    write_checkpoint(Checkpoint(arrays, facts), folder.checkpoint, sum(kept.values()))
