"""The loop of a run: survey, assemble, step, and hand each state to the outputs that want it."""

from __future__ import annotations

import os
import time as clock
from collections.abc import Iterator, Mapping
from pathlib import Path

import numpy as np
import numpy.typing as npt

from bemwave.case import Case
from bemwave.checks import judge
from bemwave.errors import InputError, RunError
from bemwave.flow.state import SurfaceState
from bemwave.geometry.files import write_mesh
from bemwave.handoff.writer import CAUTION
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
from bemwave.running.budget import refuse_too_large
from bemwave.running.forecast import forecasts
from bemwave.running.outputs import Output, outputs_of
from bemwave.running.progress import Report, note, progress
from bemwave.running.solution import Solution, nothing_solved
from bemwave.running.survey import Survey, survey
from bemwave.waves import write_sea

Array = npt.NDArray[np.float64]


def run(case: Case, out: str | os.PathLike[str], *, resume: bool = False) -> Run:
    """Solve a case and write its run folder.

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
    folder, checkpoint = RunFolder(Path(out)), None
    if resume and folder.holds_run:
        if read_manifest(folder.manifest).status == "finished":
            return Run(folder.path)
        checkpoint, _ = latest_checkpoint(folder.checkpoint)
    else:
        refuse_used_folder(folder.path)
    surveyed = survey(case)
    refuse_too_large(surveyed)
    manifest = _begin(surveyed, folder, again=resume and folder.holds_run)
    try:
        solution = _assemble(surveyed, folder)
        outputs = outputs_of(surveyed, solution, folder, _restore(solution, checkpoint))
        _loop(surveyed, solution, outputs, folder)
    except KeyboardInterrupt:
        write_manifest(manifest.with_status("interrupted"), folder.manifest)
        raise
    except Exception:
        write_manifest(manifest.with_status("failed"), folder.manifest)
        raise
    write_manifest(manifest.with_status("finished"), folder.manifest)
    finished = Run(folder.path)
    write_checks(judge(finished), folder.checks)
    note(CAUTION, folder.log)
    return finished


def _begin(surveyed: Survey, folder: RunFolder, again: bool) -> Manifest:
    """Write what is known before anything is solved."""
    case = surveyed.case
    if again and folder.case.read_text(encoding="utf-8") != case.text:
        raise InputError(
            f"{folder.path} holds a run of another case; expected the case it was started with: "
            "give that case, or another --out"
        )
    if not again:
        create_folder(folder.path, case.text)
    mesh = surveyed.water if surveyed.mesh is None else surveyed.mesh
    route, reason = surveyed.route
    manifest = Manifest(
        inputs=hashes_of(_input_files(case), case.folder),
        threads=os.cpu_count() or 1,
        route=route,
        reason=reason,
        closed=surveyed.closed,
        mirrors=tuple((m.axis, m.position) for m in surveyed.mirrors),
        part_names=mesh.part_names,
        shortest_period=surveyed.periods.kept,
        peak_period=surveyed.periods.peak,
        bodies={hull.name: Rest.of(hull) for hull in surveyed.hulls},
        notes={"case_folder": str(case.folder.resolve()), **forecasts(surveyed)},
    )
    write_mesh(mesh, folder.mesh)
    write_sea(surveyed.sea, folder.sea)
    write_manifest(manifest, folder.manifest)
    note(f"route {route}: {reason}", folder.log)
    return manifest


def _input_files(case: Case) -> list[str]:
    named = [wave.file for wave in case.waves] + [body.mesh for body in case.body]
    named += [case.surface.mesh] + [handoff.points for handoff in case.handoff]
    return sorted({str(name) for name in named if name is not None})


def _assemble(surveyed: Survey, folder: RunFolder) -> Solution | None:
    if surveyed.mesh is None:
        return None
    with progress("assembling", folder.log) as report:
        return Solution(surveyed, report)


def _restore(solution: Solution | None, checkpoint: Checkpoint | None) -> Mapping[str, int] | None:
    """Put a checkpoint back; returns how many instants each output had."""
    if checkpoint is None:
        return None
    if solution is not None:
        solution.stepper.restore(dict(checkpoint.arrays), int(checkpoint.facts["step"]))
    kept: Mapping[str, int] = checkpoint.facts["kept"]
    return kept


def _loop(
    surveyed: Survey, solution: Solution | None, outputs: dict[str, Output], folder: RunFolder
) -> None:
    """Visit every instant that an output wants, in order."""
    duration = surveyed.case.run.duration
    saved = clock.monotonic()
    with progress("solving", folder.log) as report:
        try:
            for state, wanting in _visits(solution, outputs):
                for output in wanting:
                    output.write(state)
                _check_finite(state)
                _tell(report, surveyed, solution, state, duration)
                if clock.monotonic() - saved > surveyed.case.run.checkpoint_every:
                    _save(solution, outputs, folder)
                    saved = clock.monotonic()
        except KeyboardInterrupt:
            _save(solution, outputs, folder)
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


def _check_finite(state: SurfaceState) -> None:
    if not np.isfinite(state.elevation).all():
        raise RunError(
            f"the elevation is no longer a number at t = {state.time:.6g} s; expected it finite: "
            "what was written before is whole; check the mesh with bemwave plan, or take a "
            "smaller step"
        )


def _tell(
    report: Report, surveyed: Survey, solution: Solution | None, state: SurfaceState, end: float
) -> None:
    figure = f"t = {state.time:.1f} s"
    if solution is not None and len(state.elevation):
        figure += f", highest solved wave {np.abs(state.elevation).max():.3g} m"
    report(state.time / end, figure)


def _save(solution: Solution | None, outputs: dict[str, Output], folder: RunFolder) -> None:
    for output in outputs.values():
        output.flush()
    kept = {name: output.count for name, output in outputs.items()}
    arrays: dict[str, Array] = {} if solution is None else solution.stepper.history()
    step = 0 if solution is None else solution.stepper.count
    write_checkpoint(Checkpoint(arrays, {"step": step, "kept": kept}), folder.checkpoint, step)
