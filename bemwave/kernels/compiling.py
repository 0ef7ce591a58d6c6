"""How kernels are compiled: kept from run to run, by what they were compiled from.

numba by itself knows a kernel by the time of its file, and fails where it finds no folder to write
to. Here the folder is named by bemwave's version, numba's, and the text of all kernels, so that an
old one is never taken for a new one; where it cannot be written to, each run compiles anew.
"""

from __future__ import annotations

import hashlib
import os
import tempfile
from collections.abc import Callable
from contextlib import suppress
from pathlib import Path
from typing import Any

import numba
from numba import config

__all__ = ["njit"]


def cache_folder(home: Path) -> Path | None:
    """The folder below `home` for kernels of this very text; None if it cannot be written to."""
    told = hashlib.sha256(numba.__version__.encode())
    for path in sorted(Path(__file__).parent.glob("*.py")):
        told.update(path.read_bytes())
    folder = home / f"kernels-{_version()}-{told.hexdigest()[:16]}"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return folder
    except OSError:
        return None


def _version() -> str:
    # kernels import nothing of bemwave, so that they can be read and tried by themselves
    text = Path(__file__).parents[1].joinpath("__init__.py").read_text(encoding="utf-8")
    return text.partition('__version__ = "')[2].partition('"')[0]


def _home() -> Path:
    """NUMBA_CACHE_DIR if it is set, else the user's own folder for caches."""
    if config.CACHE_DIR:
        return Path(config.CACHE_DIR) / "bemwave"
    with suppress(RuntimeError):  # a user without a home
        caches = os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache"
        return Path(caches) / "bemwave"
    return Path(tempfile.gettempdir()) / f"bemwave-{os.getuid()}"


_FOLDER = cache_folder(_home())


def njit(**options: Any) -> Callable[[Callable[..., Any]], Any]:
    """numba.njit with the same options; `cache=True` keeps what is compiled where it can."""
    cached = options.pop("cache", False) and _FOLDER is not None

    def compiled(function: Callable[..., Any]) -> Any:
        before = config.CACHE_DIR
        config.CACHE_DIR = str(_FOLDER) if cached else before
        try:
            kernel = numba.njit(cache=cached, **options)(function)
        finally:
            config.CACHE_DIR = before
        if cached:
            _forgive_full_disk(kernel)
        return kernel

    return compiled


def _forgive_full_disk(kernel: Any) -> None:
    """Let a kernel that could not be kept be used all the same."""
    keep = kernel._cache.save_overload

    def try_to_keep(signature: Any, compiled: Any) -> None:
        with suppress(OSError):
            keep(signature, compiled)

    kernel._cache.save_overload = try_to_keep
