"""Compiled kernels are kept by version and text; where they cannot be kept, it only costs time."""

from __future__ import annotations

import ctypes
import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from bemwave.kernels import compiling

ROOT = Path(compiling.__file__).parents[2]
USE = (
    "import numpy as np; from bemwave.kernels.panels import pack; import bemwave; "
    "print(pack(np.eye(3)[None]).shape, bemwave.kernels.compiling._FOLDER)"
)


def used(home: Path, *, tree: Path = ROOT, bare: bool = False) -> tuple[str, str]:
    def without_root_rights() -> None:
        ctypes.CDLL(None).prctl(24, 1)  # linux/prctl.h, linux/capability.h: permissions count

    environment = {k: v for k, v in os.environ.items() if k != "NUMBA_CACHE_DIR"}
    environment |= {"XDG_CACHE_HOME": str(home), "PYTHONPATH": str(tree)}
    done = subprocess.run(
        [sys.executable, "-B", "-c", USE],
        cwd=home.parent,
        env=environment,
        capture_output=True,
        text=True,
        preexec_fn=without_root_rights if bare else None,
    )
    assert done.returncode == 0, done.stderr
    shape, _, folder = done.stdout.strip().partition(") ")
    return shape + ")", folder


def test_an_unwritable_folder_only_costs_time(tmp_path: Path) -> None:
    home = tmp_path / "closed"
    home.mkdir()
    shape, folder = used(home)
    assert folder.startswith(str(home / "bemwave" / "kernels-"))
    shutil.rmtree(home / "bemwave")
    home.chmod(0o555)
    try:
        assert used(home, bare=True) == (shape, "None")
    finally:
        home.chmod(0o755)
    home.rmdir()
    home.write_text("a file where the folder should be")
    assert used(home) == (shape, "None")


def test_other_text_of_a_kernel_has_another_folder(tmp_path: Path) -> None:
    tree, home = tmp_path / "tree", tmp_path / "cache"
    shutil.copytree(ROOT / "bemwave", tree / "bemwave", ignore=shutil.ignore_patterns("*.nb?"))
    first = used(home, tree=tree)[1]
    assert used(home, tree=tree)[1] == first
    kernels = tree / "bemwave" / "kernels" / "panels.py"
    stamp = kernels.stat()
    kernels.write_text(kernels.read_text() + "\n# another\n")
    os.utime(kernels, ns=(stamp.st_atime_ns, stamp.st_mtime_ns))
    second = used(home, tree=tree)[1]
    version = tree / "bemwave" / "__init__.py"
    version.write_text(
        re.sub(r'__version__ = "[^"]+"', '__version__ = "9.9.9"', version.read_text())
    )
    third = used(home, tree=tree)[1]
    assert len({first, second, third}) == 3
    assert "kernels-9.9.9-" in third


def test_a_kernel_that_cannot_be_kept_is_used_all_the_same(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(*arguments: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(compiling, "_FOLDER", tmp_path)
    monkeypatch.setattr("numba.core.caching.IndexDataCacheFile.save", full)

    @compiling.njit(cache=True)
    def twice(x: float) -> float:
        return 2.0 * x

    assert twice(3.0) == 6.0


def test_all_kernels_are_compiled_so() -> None:
    for path in (ROOT / "bemwave").rglob("*.py"):
        if path.name != "compiling.py":
            text = path.read_text(encoding="utf-8")
            assert not re.search(r"from numba import .*\bn?jit\b|numba\.n?jit", text), (
                f"{path} takes njit from numba; expected from bemwave.kernels.compiling import njit"
            )
