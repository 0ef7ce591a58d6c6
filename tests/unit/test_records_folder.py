import json

import numpy as np
import pytest

from bemwave.errors import InputError
from bemwave.records import (
    Checkpoint,
    Manifest,
    Rest,
    RunFolder,
    Verdict,
    checksums,
    create_folder,
    default_folder,
    latest_checkpoint,
    read_checks,
    read_manifest,
    write_checkpoint,
    write_checks,
    write_manifest,
)

TEXT = 'title = "Ärger"\n'


def manifest(**more):
    return Manifest(
        inputs={"hull.stl": "0" * 64},
        threads=2,
        route="panels",
        reason="a basin",
        closed=True,
        mirrors=(("x", -3.5),),
        part_names=("water", "tender"),
        shortest_period=1.5,
        peak_period=6.0,
        bodies={"tender": Rest([1.0, 2.0], 0.5, [0.0, 0.0, 0.25])},
        **more,
    )


def test_a_new_folder_holds_the_case_as_given(tmp_path):
    folder = create_folder(tmp_path / "a" / "out", TEXT)
    assert folder.case.read_text(encoding="utf-8") == TEXT
    assert not folder.holds_run
    assert default_folder(tmp_path / "harbour.toml") == tmp_path / "harbour-run"


def test_a_folder_with_a_run_or_another_case_is_refused(tmp_path):
    folder = create_folder(tmp_path / "out", TEXT)
    create_folder(tmp_path / "out", TEXT)  # the case alone is no run
    with pytest.raises(InputError, match="another case than the one to run"):
        create_folder(tmp_path / "out", "title = 'b'")
    write_manifest(manifest(), folder.manifest)
    with pytest.raises(InputError, match=r"already holds a run.*--resume"):
        create_folder(tmp_path / "out", TEXT)
    file = tmp_path / "file"
    file.touch()
    with pytest.raises(InputError, match="is a file"):
        create_folder(file, TEXT)


def test_a_manifest_comes_back(tmp_path):
    folder = RunFolder(tmp_path)
    first = manifest(notes={"step": 0.1})
    write_manifest(first, folder.manifest)
    assert read_manifest(folder.manifest) == first
    ended = first.with_status("finished")
    write_manifest(ended, folder.manifest)
    back = read_manifest(folder.manifest)
    assert (back.status, back.started) == ("finished", first.started)
    assert back.ended is not None
    assert set(back.versions) >= {"bemwave", "python", "numpy"}
    assert [path.name for path in tmp_path.iterdir()] == ["manifest.json"]


def test_no_manifest_and_a_damaged_one_are_told_apart(tmp_path):
    with pytest.raises(InputError, match=r"holds no run \(manifest.json is missing\)"):
        read_manifest(RunFolder(tmp_path).manifest)
    for text in ("{", '{"status": "running"}', "[]"):
        RunFolder(tmp_path).manifest.write_text(text)
        with pytest.raises(InputError, match="is damaged"):
            read_manifest(RunFolder(tmp_path).manifest)


def test_hashes_are_those_of_sha256(tmp_path):
    (tmp_path / "abc").write_bytes(b"abc")
    # FIPS 180-2, appendix B.1
    assert checksums(tmp_path, ["abc"]) == {
        "abc": "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    }


def test_verdicts_come_back_as_the_contract_lists_them(tmp_path):
    path = RunFolder(tmp_path).checks
    verdicts = [
        Verdict("energy", 0.002, 0.01, "pass", "common practice, no source"),
        Verdict("dispersion", None, None, "info", "no wave train was solved"),
    ]
    write_checks(verdicts, path)
    assert read_checks(path) == verdicts
    content = json.loads(path.read_text())
    assert set(content[0]) == {"name", "figure", "limit", "verdict", "source"}
    path.write_text("[1]")
    with pytest.raises(InputError, match="is damaged"):
        read_checks(path)


def checkpoint(step):
    arrays = {"elevation": np.arange(100) * 0.1 + step, "none": np.zeros((0, 3))}
    return Checkpoint(arrays, {"step": step, "time": 0.1 * step, "random": [2**70, 1]})


def test_a_checkpoint_comes_back_bit_for_bit(tmp_path):
    write_checkpoint(checkpoint(3), tmp_path, 3)
    back, damaged = latest_checkpoint(tmp_path)
    assert damaged == []
    assert back.facts == checkpoint(3).facts
    for name, array in checkpoint(3).arrays.items():
        assert back.arrays[name].dtype == array.dtype
        np.testing.assert_array_equal(back.arrays[name], array)


def test_two_checkpoints_are_kept(tmp_path):
    for step in (5, 20, 100):
        write_checkpoint(checkpoint(step), tmp_path, step)
    assert sorted(p.name for p in tmp_path.iterdir()) == [
        "000000000020.ckpt",
        "000000000100.ckpt",
    ]


def test_without_checkpoints_there_is_none(tmp_path):
    assert latest_checkpoint(tmp_path / "checkpoint") == (None, [])


def test_a_damaged_checkpoint_is_noticed_and_the_one_before_used(tmp_path):
    rng = np.random.default_rng(3)
    write_checkpoint(checkpoint(1), tmp_path, 1)
    newest = write_checkpoint(checkpoint(2), tmp_path, 2)
    whole = newest.read_bytes()
    for bit in rng.integers(0, 8 * len(whole), 60):
        flipped = bytearray(whole)
        flipped[bit // 8] ^= 1 << (bit % 8)
        newest.write_bytes(bytes(flipped))
        back, damaged = latest_checkpoint(tmp_path)
        assert damaged == [f"{newest} is damaged"]
        assert back.facts["step"] == 1
    for length in (0, 10, len(whole) // 2, len(whole) - 1):
        newest.write_bytes(whole[:length])
        assert latest_checkpoint(tmp_path)[1] == [f"{newest} is damaged"]


def test_what_an_interrupted_write_leaves_is_not_taken_for_a_checkpoint(tmp_path):
    write_checkpoint(checkpoint(1), tmp_path, 1)
    (tmp_path / "000000000002.part.ckpt").write_bytes(b"half")
    back, damaged = latest_checkpoint(tmp_path)
    assert (back.facts["step"], damaged) == (1, [])
