"""Going on with a run: with the same case and inputs alone, from the newest checkpoint that holds.

A checkpoint is written when all that it counts on is on the disk. It knows how many records each
file had, and from which mesh and step the field was made.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator, Mapping
from typing import Any

from bemwave.case import Case, read_case
from bemwave.case.faults import shown, spell
from bemwave.errors import InputError
from bemwave.handoff.netcdf import records_in, why_not_whole
from bemwave.records import (
    Checkpoint,
    Manifest,
    RunFolder,
    checksums,
    latest_checkpoint,
    sync_files,
    write_checkpoint,
)
from bemwave.running.outputs import Output
from bemwave.running.progress import log
from bemwave.running.solution import Solution

MOST_TOLD = 8  # differences between two cases

Keys = tuple[str | int, ...]


def refuse_changed(case: Case, folder: RunFolder, manifest: Manifest) -> None:
    """Raise InputError if a case or a file it names is not what the run was started with."""
    before = read_case(folder.case)
    if case.model_dump() != before.model_dump():
        told = list(_differences(case, before))
        more = f"; and {len(told) - MOST_TOLD} more" if len(told) > MOST_TOLD else ""
        raise InputError(
            f"{folder.path} holds a run of another case: {'; '.join(told[:MOST_TOLD])}{more}; "
            "expected the case it was started with: give that case, or another --out"
        )
    here = [name for name in manifest.inputs if (case.folder / name).is_file()]
    changed = checksums(case.folder, here).items() - manifest.inputs.items()
    if changed:
        raise InputError(
            f"{', '.join(sorted(name for name, _ in changed))} changed since the run in "
            f"{folder.path} was started; expected the very same file: put it back, or start anew "
            "with another --out"
        )


def _differences(now: Case, before: Case) -> Iterator[str]:
    """Each key that differs, spelt as in the file, with both values."""
    tables = [case.model_dump(exclude_unset=True, exclude_none=True) for case in (now, before)]
    given, given_before = (dict(_leaves(table)) for table in tables)
    for keys in {**given, **given_before}:
        if keys not in given_before:
            yield f"{spell(keys, tables[0])} = {shown(given[keys])} is new"
        elif keys not in given:
            yield f"{spell(keys, tables[1])} = {shown(given_before[keys])} is gone"
        elif given[keys] != given_before[keys]:
            was = shown(given_before[keys])
            yield f"{spell(keys, tables[0])} is {shown(given[keys])}, was {was}"


def _leaves(value: Any, keys: Keys = ()) -> Iterator[tuple[Keys, Any]]:
    """Values of tables in tables, with the path of keys to each."""
    if isinstance(value, dict):
        inner: Any = value.items()
    elif isinstance(value, tuple | list) and value and isinstance(value[0], dict):
        inner = enumerate(value)
    else:
        yield keys, value
        return
    for key, entry in inner:
        yield from _leaves(entry, (*keys, key))


def tell_what_changed(before: Manifest, now: Manifest) -> None:
    """Warn where a run goes on with other versions or threads than it was started with."""
    changed = [
        f"{name} {now.versions[name]}, was {version}"
        for name, version in before.versions.items()
        if now.versions.get(name, version) != version
    ]
    if now.threads != before.threads:
        changed.append(f"{now.threads} threads, were {before.threads}")
    if changed:
        log.info(f"warning: going on with {'; '.join(changed)}: the last digits may differ")


def restore(solution: Solution | None, folder: RunFolder) -> Mapping[str, int] | None:
    """Put the newest sound checkpoint back; returns how many instants each output had by then."""
    checkpoint, passed_over = latest_checkpoint(
        folder.checkpoint, lambda found: _fault(found, solution, folder)
    )
    for wrong in passed_over:
        log.info(f"{wrong}: passed over")
    if checkpoint is None:
        log.info("there is no checkpoint to go on from: starting again")
        return None
    if solution is not None:
        solution.stepper.restore(dict(checkpoint.arrays), int(checkpoint.facts["step"]))
    log.info(f"going on from the checkpoint at t = {checkpoint.facts['time']:.6g} s")
    kept: Mapping[str, int] = checkpoint.facts["kept"]
    return kept


def _fault(checkpoint: Checkpoint, solution: Solution | None, folder: RunFolder) -> str:
    """Why a checkpoint cannot be gone on from, or an empty string."""
    time = f"the checkpoint at t = {checkpoint.facts['time']:.6g} s"
    if checkpoint.facts["ground"] != _ground(solution):
        return f"{time} was made on another mesh or step"
    for name, count in checkpoint.facts["files"].items():
        wrong = why_not_whole(folder.path / name, count)
        if wrong:
            return f"{time} counts on a file that is not as it was: {wrong}"
    return ""


def save(
    solution: Solution | None,
    outputs: Mapping[str, Output],
    folder: RunFolder,
    time: float,
    since: float,
) -> None:
    """Write a checkpoint at a time of the run, s, when what was written since is on the disk.

    `since` is the time of day, s, of the checkpoint before.
    """
    for output in outputs.values():
        output.flush()
    sync_files(folder.path, since)
    kept = {name: output.count for name, output in outputs.items()}
    facts = {
        "time": time,
        "step": 0 if solution is None else solution.stepper.count,
        "kept": kept,
        "files": {
            str(path.relative_to(folder.path)): records_in(path)
            for path in sorted(folder.path.rglob("*.nc"))
        },
        "ground": _ground(solution),
    }
    arrays = {} if solution is None else solution.stepper.history()
    # numbered by instants, which grow also where nothing is solved
    write_checkpoint(Checkpoint(arrays, facts), folder.checkpoint, sum(kept.values()))


def _ground(solution: Solution | None) -> str:
    """What a field's arrays stand on: the grid, a checksum of the mesh, and the step."""
    if solution is None or solution.survey.mesh is None:
        return "nothing solved"
    mesh = solution.survey.mesh
    grid = repr(solution.survey.sheet).encode()
    found = hashlib.sha256(grid + mesh.points.tobytes() + mesh.triangles.tobytes())
    return f"{found.hexdigest()} step {solution.step!r}"
