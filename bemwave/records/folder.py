"""The run folder: what lies where, and files that are either whole or not there."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from bemwave.errors import InputError


@dataclass(frozen=True)
class RunFolder:
    """Paths of a run folder."""

    path: Path

    @property
    def case(self) -> Path:
        """The case as it was given."""
        return self.path / "case.toml"

    @property
    def manifest(self) -> Path:
        """What ran, with what, and how it ended."""
        return self.path / "manifest.json"

    @property
    def mesh(self) -> Path:
        """The panels."""
        return self.path / "mesh.vtp"

    @property
    def riders(self) -> Path:
        """The bodies that ride the surface: they have no panels."""
        return self.path / "riders.vtp"

    @property
    def sea(self) -> Path:
        """The incident waves."""
        return self.path / "sea.nc"

    @property
    def history(self) -> Path:
        """The solved field over time."""
        return self.path / "history.nc"

    @property
    def bodies(self) -> Path:
        """Motions and forces."""
        return self.path / "bodies.nc"

    @property
    def energy(self) -> Path:
        """Energy of the solved field."""
        return self.path / "energy.nc"

    @property
    def gauges(self) -> Path:
        """Wave gauges."""
        return self.path / "gauges.nc"

    @property
    def handoff(self) -> Path:
        """Folder of the hand-off files."""
        return self.path / "handoff"

    @property
    def frames(self) -> Path:
        """Folder of the frames."""
        return self.path / "frames"

    @property
    def checkpoint(self) -> Path:
        """Folder of the checkpoints."""
        return self.path / "checkpoint"

    @property
    def checks(self) -> Path:
        """The verdicts."""
        return self.path / "checks.json"

    @property
    def page(self) -> Path:
        """The page for people."""
        return self.path / "report.html"

    @property
    def figures(self) -> Path:
        """Folder of the page's figures."""
        return self.path / "report"

    @property
    def log(self) -> Path:
        """What was said while it ran."""
        return self.path / "log.txt"

    @property
    def holds_run(self) -> bool:
        """Whether a run was started here."""
        return self.manifest.exists()


def default_folder(case_file: Path) -> Path:
    """The run folder of a case file when none is named: its name and -run, beside it."""
    return case_file.with_name(case_file.stem + "-run")


def refuse_used_folder(path: Path) -> None:
    """Raise InputError where a new run cannot go: before anything is made."""
    if path.exists() and not path.is_dir():
        raise InputError(
            f"{path} is a file; expected a folder for the run: name another with --out"
        )
    if RunFolder(path).holds_run:
        raise InputError(
            f"{path} already holds a run; expected a new folder: name another with --out, or go "
            "on with that run by --resume"
        )


def create_folder(path: Path, case_text: str) -> RunFolder:
    """Make a folder for a new run and put the case in it.

    Raises
    ------
    InputError
        If the folder holds a run, is a file, or holds another case.toml.
    """
    refuse_used_folder(path)
    folder = RunFolder(path)
    if folder.case.exists() and folder.case.read_text(encoding="utf-8") != case_text:
        raise InputError(
            f"{folder.case} is another case than the one to run; expected a folder of its own: "
            "name another with --out"
        )
    path.mkdir(parents=True, exist_ok=True)
    write_whole(folder.case, case_text.encode("utf-8"))
    return folder


def write_whole(path: Path, content: bytes) -> None:
    """Write a file beside its name, put it on the disk, rename it: whole or not there."""
    with whole(path) as beside:
        beside.write_bytes(content)


@contextmanager
def whole(path: Path) -> Iterator[Path]:
    """Yield a path to write a file to, of the same ending; it then gets its name, whole."""
    beside = path.with_stem(path.stem + ".part")
    beside.unlink(missing_ok=True)
    yield beside
    sync(beside)
    os.replace(beside, path)
    sync(path.parent)  # the new name itself must survive a loss of power


def sync_files(folder: Path, since: float) -> None:
    """Put on the disk what was written below a folder since a time of day, s."""
    for path in [folder, *folder.rglob("*")]:
        if path.stat().st_mtime >= since:
            sync(path)


def checksums(folder: Path, names: Iterable[str]) -> dict[str, str]:
    """SHA-256 of files, by their names from a folder."""
    found = {}
    for name in names:
        with (folder / name).open("rb") as file:
            found[name] = hashlib.file_digest(file, "sha256").hexdigest()
    return found


def sync(path: Path) -> None:
    """Put a file, or the names in a folder, on the disk."""
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
