"""A whole run on one thread and on two: the same to 1e-10 (the kernels to the bit, see units)."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pytest

from tests.restart.cases import CASES, arrays_of, command, files_of, write_case

SHORT = ("tank",)


def run_on(threads: int, name: str, home: Path) -> Path:
    home.mkdir()
    case = write_case(name, home)
    number = dict.fromkeys(
        ("NUMBA_NUM_THREADS", "OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"),
        str(threads),
    )
    with pytest.MonkeyPatch.context() as patch:
        for key, value in number.items():
            patch.setenv(key, value)
        running = command("run", case.name, cwd=home)
    _, told = running.communicate(timeout=300)
    assert running.returncode == 0, told
    return home / "case-run"


@pytest.mark.skipif((os.cpu_count() or 1) < 2, reason="one core, one thread")
@pytest.mark.parametrize(
    "name", [pytest.param(name, marks=[] if name in SHORT else pytest.mark.slow) for name in CASES]
)
def test_one_thread_and_two_agree(name: str, tmp_path: Path) -> None:
    one, two = (run_on(n, name, tmp_path / str(n)) for n in (1, 2))
    files = sorted(file for file in files_of(one) if file.suffix == ".nc")
    assert files
    for file in files:
        second = arrays_of(two / file)
        for key, array in arrays_of(one / file).items():
            if array.dtype.kind != "f":
                np.testing.assert_array_equal(array, second[key])
                continue
            # what is stored in single precision may differ by its rounding
            part = 1e-10 if array.dtype == np.float64 else 2.0**-23
            scale = np.nanmax(np.abs(array), initial=0.0)
            where = f"{file} {key}"
            np.testing.assert_allclose(array, second[key], rtol=0, atol=part * scale, err_msg=where)
