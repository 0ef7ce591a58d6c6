"""`import bemwave` is quick, light, and its public names are what they say."""

from __future__ import annotations

import importlib
import os
import pkgutil
import subprocess
import sys
import types
from pathlib import Path

import bemwave


def fresh(code: str) -> str:
    """The output of a new interpreter, its path where this bemwave is."""
    environment = os.environ | {"PYTHONPATH": str(Path(bemwave.__file__).parents[1])}
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, env=environment, check=True
    )
    return done.stdout


def test_import_costs_less_than_a_fifth_of_a_second() -> None:
    code = "import time; t = time.perf_counter(); import bemwave; print(time.perf_counter() - t)"
    assert min(float(fresh(code)) for _ in range(3)) < 0.2


def test_import_loads_no_library() -> None:
    code = (
        "import sys; before = set(sys.modules); import bemwave; "
        "print(*sorted({name.split('.')[0] for name in set(sys.modules) - before}))"
    )
    loaded = set(fresh(code).split()) - {"bemwave"}
    assert loaded <= set(sys.stdlib_module_names)


def test_every_public_name_is_there() -> None:
    for name in bemwave.__all__:
        assert name in dir(bemwave)
        assert isinstance(getattr(bemwave, name), types.FunctionType | type), name


def test_no_module_shadows_a_public_name() -> None:
    modules = {module.name for module in pkgutil.iter_modules(bemwave.__path__)}
    assert not modules & set(bemwave.__all__)
    for module in sorted(modules):
        importlib.import_module(f"bemwave.{module}")
    for name in bemwave.__all__:
        assert not isinstance(getattr(bemwave, name), types.ModuleType), name


def test_a_wrong_name_is_an_attribute_error() -> None:
    assert not hasattr(bemwave, "wave_number")
