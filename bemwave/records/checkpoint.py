"""checkpoint/: where a run can go on from. Two are kept; a damaged one is noticed.

A checkpoint is one file: a line with the SHA-256 of the rest, then a NumPy archive.
"""

from __future__ import annotations

import hashlib
import json
import zipfile
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from io import BufferedRandom, BufferedReader
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from bemwave.records.folder import whole

KEPT = 2
_MARK = b"bemwave checkpoint 2 sha256 "
_LENGTH = len(_MARK) + 64 + 1  # of the first line
_FACTS = "facts"


@dataclass(frozen=True)
class Checkpoint:
    """What a run needs to go on.

    Attributes
    ----------
    arrays : by name; the integrator's state and history.
    facts : anything JSON can hold: step, time, records and frames written so far.
    """

    arrays: Mapping[str, NDArray[Any]]
    facts: Mapping[str, Any]


def write_checkpoint(checkpoint: Checkpoint, folder: Path, number: int) -> Path:
    """Write a checkpoint and remove all but the two latest.

    Parameters
    ----------
    checkpoint : Checkpoint
        No array may be called "facts".
    folder : Path
    number : int
        Grows from one checkpoint to the next: the step it was made after.
    """
    facts = np.frombuffer(json.dumps(checkpoint.facts).encode("utf-8"), dtype=np.uint8)
    folder.mkdir(parents=True, exist_ok=True)
    path = folder / f"{number:012d}.ckpt"
    # not made in memory first: it may be the larger part of what the run takes
    with whole(path) as beside, beside.open("w+b") as file:
        file.write(bytes(_LENGTH))
        np.savez(file, allow_pickle=False, **{_FACTS: facts, **checkpoint.arrays})
        head = _head(file)
        file.seek(0)
        file.write(head)
    for old in folder.glob("*.ckpt"):  # halves that an interrupted write left, too
        if old not in _newest_first(folder)[:KEPT]:
            old.unlink()
    return path


def latest_checkpoint(
    folder: Path, fault: Callable[[Checkpoint], str] = lambda checkpoint: ""
) -> tuple[Checkpoint | None, list[str]]:
    """Read the newest checkpoint that is whole and has no fault.

    Parameters
    ----------
    folder : Path
    fault : why a checkpoint cannot be gone on from, or an empty string.

    Returns
    -------
    checkpoint : None where there is none to go on from.
    passed_over : what is wrong with the newer ones.
    """
    passed_over: list[str] = []
    for path in _newest_first(folder):
        checkpoint = _read(path)
        wrong = f"{path} is damaged" if checkpoint is None else fault(checkpoint)
        if not wrong:
            return checkpoint, passed_over
        passed_over.append(wrong)
    return None, passed_over


def _newest_first(folder: Path) -> list[Path]:
    return sorted((p for p in folder.glob("*.ckpt") if p.stem.isdecimal()), reverse=True)


def _read(path: Path) -> Checkpoint | None:
    """The checkpoint in a file, or None if the file is not what was written."""
    try:
        with path.open("rb") as file:
            head = _head(file)
            file.seek(0)
            if file.read(len(head)) != head:
                return None
            with np.load(file, allow_pickle=False) as archive:
                if any(entry.compress_type for entry in archive.zip.infolist()):
                    return None  # not how it is written; it might unfold without end
                arrays = {name: archive[name] for name in archive.files}
        return Checkpoint(arrays, json.loads(arrays.pop(_FACTS).tobytes()))
    except (OSError, ValueError, KeyError, MemoryError, zipfile.BadZipFile):
        return None


def _head(file: BufferedReader | BufferedRandom) -> bytes:
    """The first line that a file should have."""
    file.seek(_LENGTH)
    return _MARK + hashlib.file_digest(file, "sha256").hexdigest().encode("ascii") + b"\n"
