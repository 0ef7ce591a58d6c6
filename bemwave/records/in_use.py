"""A run folder has one writer at a time, and nothing in it leads out of it."""

from __future__ import annotations

import fcntl
import os
from collections.abc import Iterator
from contextlib import contextmanager

from bemwave.errors import InputError
from bemwave.records.folder import RunFolder


@contextmanager
def alone_in(folder: RunFolder) -> Iterator[None]:
    """Hold a run folder against other runs.

    The lock is the system's own, on log.txt: it ends with the process that holds it, however that
    ends, so that a killed run leaves none behind.

    Raises
    ------
    InputError
        If another run holds the folder, or there are symbolic links in it.
    """
    refuse_links(folder)
    with folder.log.open("ab") as file:
        try:
            fcntl.flock(file, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError:
            raise InputError(
                f"{folder.path} is in use by another run, the one that writes {folder.log.name} "
                "there; expected a folder of its own: wait until that has ended, or name another "
                "with --out"
            ) from None
        yield


def refuse_links(folder: RunFolder) -> None:
    """Raise InputError if a symbolic link in a run folder could lead what is written elsewhere."""
    for home, folders, files in os.walk(folder.path):
        for name in folders + files:
            path = os.path.join(home, name)
            if os.path.islink(path):
                raise InputError(
                    f"{path} is a symbolic link to {os.readlink(path)}; expected plain files in a "
                    "run folder, for what is written there must stay there: remove the link"
                )
