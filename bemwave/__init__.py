"""Far-field ocean waves round ships and platforms, handed to near-field solvers and renderers.

>>> import bemwave
>>> case = bemwave.read_case("case.toml")  # doctest: +SKIP
>>> run = bemwave.run(case, "out")  # doctest: +SKIP
>>> round(float(bemwave.wavenumber(8.0, 40.0)), 6)  # period s, depth m; 1/m
0.063677

The names are imported when first used, so that `import bemwave` is quick and needs no library.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from bemwave.case import Case, read_case
    from bemwave.errors import (
        BemwaveError,
        InputError,
        MissingLibraryError,
        NotYetError,
        RunError,
    )
    from bemwave.records import open_run
    from bemwave.running import run, steps
    from bemwave.waves import wavenumber

__version__ = "0.1.0"

_homes = {
    "Case": "case",
    "read_case": "case",
    "run": "running",
    "steps": "running",
    "open_run": "records",
    "wavenumber": "waves",
    "BemwaveError": "errors",
    "InputError": "errors",
    "MissingLibraryError": "errors",
    "NotYetError": "errors",
    "RunError": "errors",
}

__all__ = [
    "BemwaveError",
    "Case",
    "InputError",
    "MissingLibraryError",
    "NotYetError",
    "RunError",
    "open_run",
    "read_case",
    "run",
    "steps",
    "wavenumber",
]


def __getattr__(name: str) -> Any:
    if name not in _homes:
        raise AttributeError(f"module 'bemwave' has no attribute '{name}'")
    return getattr(import_module(f"bemwave.{_homes[name]}"), name)


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
