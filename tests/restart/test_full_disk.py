"""A disk that fills up, a file that may grow no longer, a folder made read-only: exit code 3."""

from __future__ import annotations

import ctypes
import os
import resource
import shutil
import subprocess
import time
from collections.abc import Callable, Iterator
from contextlib import suppress
from pathlib import Path

import numpy as np
import pytest

from bemwave import open_run
from bemwave.case import read_case
from bemwave.running import run
from tests.restart.cases import TANK, assert_readable, assert_same, command, wait_for

CASE = TANK.replace("[run]\n", "[run]\ncheckpoint_every = 0.02\n").replace(
    'formats = ["ply", "vtk"]\nstart = 2.0\nfps = 5', 'formats = ["ply", "vtk"]\nfps = 10'
)


@pytest.fixture(scope="module")
def expected(tmp_path_factory: pytest.TempPathFactory) -> Path:
    home = tmp_path_factory.mktemp("whole")
    (home / "case.toml").write_text(CASE)
    run(read_case(home / "case.toml"), home / "run")
    return home / "run"


def assert_told(stopped: subprocess.Popen[str], folder: Path) -> None:
    """Exit code 3 and one line that says where, why and what to do; what is there is readable."""
    _, told = stopped.communicate(timeout=120)
    assert stopped.returncode == 3, told
    assert told.startswith(f"error: {folder.name} could not be written any further at step ")
    assert told.count("\n") == 1, told
    assert "then go on with --resume" in told
    if (folder / "manifest.json").exists():
        open_run(folder)
    assert_readable(folder)


def limited(size: int) -> Callable[[], None]:
    return lambda: resource.setrlimit(resource.RLIMIT_FSIZE, (size, size))


def stop_at_size(size: int, expected: Path, home: Path) -> None:
    home.mkdir()
    (home / "case.toml").write_text(CASE)
    arguments = ("run", "case.toml", "--out", "run", "--resume")
    stopped = command(*arguments, cwd=home, prepare=limited(size))
    assert_told(stopped, home / "run")
    run(read_case(home / "case.toml"), home / "run", resume=True)
    assert_same(expected, home / "run")


# the kernels' cache must be there, for it may not grow either; `expected` has made it
def test_a_file_that_may_grow_no_longer_ends_the_run_resumably(
    expected: Path, tmp_path: Path
) -> None:
    sizes = sorted({path.stat().st_size for path in expected.rglob("*") if path.is_file()})
    stop_at_size(sizes[-1] - 1, expected, tmp_path / "largest")


@pytest.mark.slow
def test_a_limit_at_any_size_ends_the_run_resumably(expected: Path, tmp_path: Path) -> None:
    sizes = sorted({path.stat().st_size for path in expected.rglob("*") if path.is_file()})
    for size in np.random.default_rng(2).choice(sizes[:-1], 8, replace=False):
        stop_at_size(int(size), expected, tmp_path / str(size))


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    disk = tmp_path / "disk"
    disk.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", "size=24m", "none", str(disk)]
    if os.getuid() != 0 or shutil.which("mount") is None or subprocess.run(mount).returncode:
        pytest.skip("needs the right to mount a small disk")
    yield disk
    subprocess.run(["umount", str(disk)], check=True)


def fill(disk: Path, leave: int) -> Path:
    """Fill a disk but for some bytes, while another program writes to it."""
    ballast = disk / "ballast"
    with suppress(OSError), ballast.open("wb", buffering=0) as file:
        while True:
            file.write(bytes(65_536))
    os.truncate(ballast, max(0, ballast.stat().st_size - leave))
    return ballast


@pytest.mark.slow
def test_a_disk_that_fills_up_at_random_moments(expected: Path, small_disk: Path) -> None:
    (small_disk / "case.toml").write_text(CASE)
    rng, folder, full = np.random.default_rng(8), small_disk / "run", 0
    for _ in range(8):
        with command("run", "case.toml", "--out", "run", "--resume", cwd=small_disk) as stopped:
            wait_for(folder / "log.txt", "set up in", stopped)
            time.sleep(rng.uniform(0.0, 0.6))
            ballast = fill(small_disk, int(rng.integers(0, 40_000)))
            stopped.wait(timeout=120)
            if stopped.returncode != 0:
                full += 1
                assert_told(stopped, folder)
        ballast.unlink()
        if stopped.returncode == 0:
            shutil.rmtree(folder)
    assert full > 0
    run(read_case(small_disk / "case.toml"), folder, resume=True)
    assert_same(expected, folder)


def without_root_rights() -> None:
    """Let permissions count for root too, from the next program on."""
    drop_from_bounding_set, override_permissions = 24, 1  # linux/prctl.h, linux/capability.h
    ctypes.CDLL(None).prctl(drop_from_bounding_set, override_permissions)


def test_a_folder_made_read_only_ends_the_run_resumably(tmp_path: Path) -> None:
    text = TANK.partition("[frames]")[0].replace("duration = 4.0", "duration = 30.0")
    (tmp_path / "case.toml").write_text(text.replace("[run]\n", "[run]\ncheckpoint_every = 0.3\n"))
    folder = tmp_path / "run"
    arguments = ("run", "case.toml", "--out", "run")
    stopped = command(*arguments, cwd=tmp_path, prepare=without_root_rights)
    while not any(path.stem.isdecimal() for path in (folder / "checkpoint").glob("*.ckpt")):
        assert stopped.poll() is None
        time.sleep(0.01)
    set_rights(folder, 0o555, 0o444)
    assert_told(stopped, folder)
    set_rights(folder, 0o755, 0o644)
    run(read_case(tmp_path / "case.toml"), folder, resume=True)
    assert "going on from the checkpoint" in (folder / "log.txt").read_text()


def set_rights(folder: Path, folders: int, files: int) -> None:
    for path in [folder, *folder.rglob("*")]:
        with suppress(FileNotFoundError):  # one that was there for a moment
            path.chmod(folders if path.is_dir() else files)
