"""A flipped bit in a run folder is found, or harmless: never another result without a word."""

from __future__ import annotations

import hashlib
import io
import pickle
import shutil
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from bemwave import open_run
from bemwave.case import Case, read_case
from bemwave.errors import BemwaveError, InputError
from bemwave.records import latest_checkpoint
from bemwave.running import check, run
from tests.restart.cases import arrays_of, assert_same, interrupted, write_case

SHORT, LONG = 6, 50  # flips of each file


@pytest.fixture(scope="module")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    home = tmp_path_factory.mktemp("finished")
    run(read_case(write_case("tank", home)), home / "run")
    return home / "run"


def flip(path: Path, bit: int) -> None:
    content = bytearray(path.read_bytes())
    content[bit // 8] ^= 1 << (bit % 8)
    path.write_bytes(content)


def bits_of(path: Path, count: int) -> list[int]:
    rng = np.random.default_rng(len(path.name))
    return [int(bit) for bit in rng.integers(0, 8 * path.stat().st_size, count)]


def assert_found_or_harmless(finished: Path, name: str, count: int, home: Path) -> None:
    damaged = home / "run"
    shutil.copytree(finished, damaged)
    whole = (finished / name).read_bytes()
    for bit in bits_of(finished / name, count):
        flip(damaged / name, bit)
        found = ""
        try:
            check(damaged)
        except InputError as error:
            found = str(error)
        if not found:  # 1e-05 may become 1E-05
            assert name == "manifest.json"
            assert open_run(damaged).manifest == open_run(finished).manifest
        assert not found or "damaged" in found
        (damaged / name).write_bytes(whole)
    assert check(damaged)


FILES = ("manifest.json", "history.nc", "handoff/box.nc", "energy.nc", "mesh.vtp", "sea.nc")


@pytest.mark.parametrize("name", FILES)
def test_check_finds_a_flipped_bit_in_any_file(name: str, finished: Path, tmp_path: Path) -> None:
    assert_found_or_harmless(finished, name, SHORT, tmp_path)


@pytest.mark.slow
@pytest.mark.parametrize("name", FILES)
def test_check_finds_every_flipped_bit(name: str, finished: Path, tmp_path: Path) -> None:
    assert_found_or_harmless(finished, name, LONG, tmp_path)


@pytest.mark.parametrize("name", ["history.nc", "handoff/box.nc"])
def test_a_flipped_bit_among_the_numbers_is_found_by_any_reader(
    name: str, finished: Path, tmp_path: Path
) -> None:
    path, whole = tmp_path / "copy.nc", arrays_of(finished / name)
    content = (finished / name).read_bytes()
    silent = 0
    for bit in bits_of(finished / name, LONG):
        path.write_bytes(content)
        flip(path, bit)
        try:
            arrays = arrays_of(path)
        except (OSError, RuntimeError, ValueError, MemoryError):
            continue  # found
        silent += arrays.keys() != whole.keys() or any(
            arrays[key].tobytes() != whole[key].tobytes() for key in whole
        )
    assert silent == 0


def test_a_run_opened_from_python_tells_of_damage_too(finished: Path, tmp_path: Path) -> None:
    damaged = tmp_path / "run"
    shutil.copytree(finished, damaged)
    path = damaged / "history.nc"
    flip(path, 8 * (path.stat().st_size - 1000))
    opened = open_run(damaged)
    with pytest.raises(InputError, match=r"history\.nc is missing or damaged"):
        _ = [opened.state(time) for time in opened.times]
    flip(damaged / "mesh.vtp", 8 * 2000)
    with pytest.raises(InputError, match=r"mesh\.vtp is damaged or was changed after the run"):
        _ = open_run(damaged).mesh
    (damaged / "energy.nc").unlink()
    shutil.copy(finished / "history.nc", path)
    shutil.copy(finished / "mesh.vtp", damaged / "mesh.vtp")
    with pytest.raises(InputError, match=r"energy\.nc is missing; expected all that the run wrote"):
        check(damaged)


@pytest.fixture(scope="module")
def half_way(tmp_path_factory: pytest.TempPathFactory) -> tuple[Case, Path]:
    """A run that ended in the middle, with two checkpoints and nothing after the later."""
    home = tmp_path_factory.mktemp("half")
    with pytest.MonkeyPatch.context() as patch:
        case = read_case(write_case("tank", home))
        interrupted(case, home / "run", patch, 20, 12)
    return case, home / "run"


def resume_after(change: Callable[[Path], None], half_way: tuple[Case, Path], out: Path) -> str:
    """Go on after some damage: what was said; a refusal in words counts as found."""
    case, before = half_way
    shutil.rmtree(out, ignore_errors=True)
    shutil.copytree(before, out)
    change(out)
    try:
        run(case, out, resume=True)
    except BemwaveError as error:
        return f"refused: {error}"
    return (out / "log.txt").read_text()


def flips_before_resuming(
    count: int, half_way: tuple[Case, Path], finished: Path, home: Path
) -> None:
    files = ["history.nc", "gauges.nc", "handoff/box.nc", "manifest.json"]
    files += [f"checkpoint/{path.name}" for path in (half_way[1] / "checkpoint").iterdir()]
    for name in files:
        for bit in bits_of(half_way[1] / name, count):
            said = resume_after(lambda out, n=name, b=bit: flip(out / n, b), half_way, home / "run")
            if not said.startswith("refused: "):
                assert_same(finished, home / "run")


def test_a_run_does_not_go_on_from_damage_without_a_word(
    half_way: tuple[Case, Path], finished: Path, tmp_path: Path
) -> None:
    flips_before_resuming(1, half_way, finished, tmp_path)


@pytest.mark.long
def test_two_hundred_flips_before_resuming(
    half_way: tuple[Case, Path], finished: Path, tmp_path: Path
) -> None:
    flips_before_resuming(34, half_way, finished, tmp_path)


def test_a_checkpoint_cannot_bring_code_or_endless_data(tmp_path: Path) -> None:
    mark = b"bemwave checkpoint 2 sha256 "
    for archive in (_pickled(io.BytesIO(), pickle.dumps(print)), _folded(io.BytesIO())):
        head = mark + hashlib.sha256(archive).hexdigest().encode()
        (tmp_path / "000000000001.ckpt").write_bytes(head + b"\n" + archive)
        found, passed_over = latest_checkpoint(tmp_path)
        assert found is None
        assert passed_over == [f"{tmp_path / '000000000001.ckpt'} is damaged"]


def _pickled(file: io.BytesIO, payload: bytes) -> bytes:
    np.savez(file, facts=np.array([payload], dtype=object), allow_pickle=True)
    return file.getvalue()


def _folded(file: io.BytesIO) -> bytes:
    np.savez_compressed(file, facts=np.zeros(10_000_000, dtype=np.uint8))
    return file.getvalue()
