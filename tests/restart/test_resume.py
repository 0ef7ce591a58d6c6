"""A run that was interrupted and goes on ends with the very arrays of one that was not."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import netCDF4
import pytest
import pyvista

from bemwave import __version__
from bemwave.case import Case, read_case
from bemwave.errors import InputError, RunError
from bemwave.records import (
    Checkpoint,
    checksums,
    latest_checkpoint,
    read_manifest,
    write_checkpoint,
    write_manifest,
)
from bemwave.running import loop, run
from tests.restart.cases import CASES, SEA_ALONE, TANK, assert_same, interrupted, write_case


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], tuple[Case, Path]]:
    """Each case and the folder of its uninterrupted run, made once."""
    made: dict[str, tuple[Case, Path]] = {}

    def of(name: str) -> tuple[Case, Path]:
        if name not in made:
            home = tmp_path_factory.mktemp("whole")
            case = read_case(write_case(name, home))
            run(case, home / "run")
            made[name] = case, home / "run"
        return made[name]

    return of


@pytest.mark.parametrize("name", CASES)
@pytest.mark.parametrize("stops", [(1,), (25,), (20, 25, 5)], ids=str)
def test_interrupted_and_resumed_is_bit_identical(
    name: str,
    stops: tuple[int, ...],
    whole: Callable[[str], tuple[Case, Path]],
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    case, expected = whole(name)
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, *stops)
    assert read_manifest(out / "manifest.json").status == "interrupted"
    run(case, out, resume=True)
    assert read_manifest(out / "manifest.json").status == "finished"
    assert_same(expected, out)


def test_a_damaged_checkpoint_is_passed_over_and_told(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, expected = whole("tank")
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, 20, 10)
    latest = max((out / "checkpoint").iterdir())
    latest.write_bytes(latest.read_bytes()[:-100])
    run(case, out, resume=True)
    assert f"{latest} is damaged: passed over" in (out / "log.txt").read_text()
    assert_same(expected, out)


def test_without_a_checkpoint_it_starts_again_and_says_so(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, expected = whole("tank")
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, 20)
    for file in (out / "checkpoint").iterdir():
        file.unlink()
    run(case, out, resume=True)
    assert "no checkpoint to go on from: starting again" in (out / "log.txt").read_text()
    assert_same(expected, out)


def test_resume_where_nothing_was_started_starts(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path
) -> None:
    case, expected = whole("tank")
    run(case, tmp_path / "run", resume=True)
    assert_same(expected, tmp_path / "run")


def test_a_finished_run_is_left_as_it_is(whole: Callable[[str], tuple[Case, Path]]) -> None:
    case, folder = whole("tank")
    before = {p: p.stat().st_mtime_ns for p in folder.rglob("*") if p.is_file()}
    run(case, folder, resume=True)
    assert before == {p: p.stat().st_mtime_ns for p in folder.rglob("*") if p.is_file()}


def test_a_run_of_another_case_is_not_gone_on_with(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, _ = whole("tank")
    interrupted(case, tmp_path / "run", monkeypatch, 20)
    (tmp_path / "other.toml").write_text(TANK.replace("stroke = 0.02", "stroke = 0.03"))
    with pytest.raises(
        InputError, match=r"another case: \[\[wavemaker\]\] stroke is 0.03, was 0.02; expected"
    ):
        run(read_case(tmp_path / "other.toml"), tmp_path / "run", resume=True)


def test_a_full_disk_ends_the_run_resumably(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, expected = whole("tank")
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, 20)

    def full(*arguments: object) -> None:
        raise OSError(28, "No space left on device")

    with monkeypatch.context() as patch:
        patch.setattr(loop, "refuse_no_numbers", full)
        with pytest.raises(RunError, match=r"No space left on device.*--resume"):
            run(case, out, resume=True)
    assert read_manifest(out / "manifest.json").status == "failed"
    run(case, out, resume=True)
    assert_same(expected, out)


def test_a_field_that_is_no_longer_a_number_ends_the_run(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, _ = whole("tank")
    interrupted(case, tmp_path / "run", monkeypatch, 20)
    latest = max((tmp_path / "run" / "checkpoint").iterdir())
    kept = latest_checkpoint(latest.parent)[0]
    assert kept is not None
    spoiled = {name: array * float("nan") for name, array in kept.arrays.items()}
    write_checkpoint(Checkpoint(spoiled, kept.facts), latest.parent, 10**6)
    with pytest.raises(RunError, match=r"no longer a number at step \d+, t = "):
        run(case, tmp_path / "run", resume=True)


def test_a_case_that_says_the_same_in_other_words_is_gone_on_with(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, expected = whole("tank")
    interrupted(case, tmp_path / "run", monkeypatch, 20)
    (tmp_path / "same.toml").write_text("# the tank again\n" + TANK.replace("0.02", "2e-2"))
    run(read_case(tmp_path / "same.toml"), tmp_path / "run", resume=True)
    assert_same(expected, tmp_path / "run")


def test_every_key_that_differs_is_listed(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, _ = whole("tank")
    interrupted(case, tmp_path / "run", monkeypatch, 20)
    changed = TANK.replace("duration = 4.0", "duration = 6.0").replace("every = 0.1\nvol", "vol")
    changed += '[[gauge]]\nname = "new"\nposition = [1.0, 0.0]\n'
    (tmp_path / "other.toml").write_text(changed)
    with pytest.raises(InputError) as told:
        run(read_case(tmp_path / "other.toml"), tmp_path / "run", resume=True)
    assert str(told.value) == (
        f"{tmp_path / 'run'} holds a run of another case: [run] duration is 6.0, was 4.0; "
        '[[gauge]] "new" name = "new" is new; [[gauge]] "new" position = [1.0, 0.0] is new; '
        "[[handoff]] end is 6.0, was 4.0; [frames] end is 6.0, was 4.0; "
        "[[handoff]] every = 0.1 is gone; expected the case it was started with: give that case, "
        "or another --out"
    )


def test_a_file_that_changed_since_is_not_gone_on_with(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    table = SEA_ALONE.replace('"jonswap"\nheight = 0.1\nperiod = 2.0\ncomponents = 50', '"table"')
    table = table.replace('"table"', '"table"\nfile = "waves.csv"')
    waves = tmp_path / "waves.csv"
    waves.write_text("frequency_rad_s,heading_deg,amplitude_m,phase_deg\n3.0,0,0.1,0\n")
    (tmp_path / "case.toml").write_text(table)
    case = read_case(tmp_path / "case.toml")
    interrupted(case, tmp_path / "run", monkeypatch, 20)
    waves.write_text(waves.read_text().replace("0.1", "0.2"))
    with pytest.raises(InputError, match=r"waves\.csv changed since the run in .* was started"):
        run(case, tmp_path / "run", resume=True)


def test_other_versions_are_told_and_gone_on_with(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, expected = whole("sea alone")
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, 20)
    before = read_manifest(out / "manifest.json")
    older = {**before.versions, "bemwave": "0.0.9"}
    write_manifest(replace(before, versions=older, threads=64), out / "manifest.json")
    run(case, out, resume=True)
    assert re.search(
        r"warning: going on with bemwave \S+, was 0\.0\.9; \d+ threads, were 64: the last digits "
        "may differ",
        (out / "log.txt").read_text(),
    )
    after = read_manifest(out / "manifest.json")
    assert after.started == before.started
    assert len(after.notes["gone_on"]) == 1
    assert_same(expected, out)


def test_a_file_that_lost_records_sends_back_to_the_checkpoint_before(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, expected = whole("tank")
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, 20, 10)
    with netCDF4.Dataset(out / "gauges.nc", "a") as file:
        file["written"][29] = 0
    run(case, out, resume=True)
    said = (out / "log.txt").read_text()
    assert f"{out / 'gauges.nc'} holds 29 whole records of " in said
    assert said.count("going on from the checkpoint") == 2
    assert_same(expected, out)


def test_a_checkpoint_of_another_mesh_is_not_used(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, expected = whole("tank")
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, 20)
    path = max((out / "checkpoint").iterdir())
    kept = latest_checkpoint(path.parent)[0]
    assert kept is not None
    write_checkpoint(Checkpoint(kept.arrays, {**kept.facts, "ground": "other"}), path.parent, 10**6)
    run(case, out, resume=True)
    assert "was made on another mesh or step: passed over" in (out / "log.txt").read_text()
    assert_same(expected, out)


def test_a_folder_in_use_is_refused_and_free_again_after_a_kill(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, expected = whole("tank")
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, 20)
    code = (
        "import sys, time; from pathlib import Path; from bemwave.records import *\n"
        "with alone_in(RunFolder(Path(sys.argv[1]))): print('held', flush=True); time.sleep(60)"
    )
    command = [sys.executable, "-c", code, str(out)]
    home = str(Path(loop.__file__).parents[2])
    environment = {**os.environ, "PYTHONPATH": home}
    with subprocess.Popen(command, stdout=subprocess.PIPE, env=environment) as other:
        assert other.stdout is not None
        assert other.stdout.readline() == b"held\n"
        with pytest.raises(InputError, match=r"run is in use by another run"):
            run(case, out, resume=True)
        other.kill()
    run(case, out, resume=True)
    assert_same(expected, out)


def test_links_in_a_run_folder_are_not_followed(
    whole: Callable[[str], tuple[Case, Path]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    case, _ = whole("sea alone")
    out = tmp_path / "run"
    interrupted(case, out, monkeypatch, 20)
    outside = tmp_path / "outside"
    (out / "gauges.nc").rename(outside)
    (out / "gauges.nc").symlink_to(outside)
    before = outside.read_bytes()
    with pytest.raises(InputError, match=rf"gauges\.nc is a symbolic link to {outside}; expected"):
        run(case, out, resume=True)
    assert outside.read_bytes() == before


def test_what_a_finished_run_wrote_has_its_checksums_in_the_manifest(
    whole: Callable[[str], tuple[Case, Path]],
) -> None:
    _, folder = whole("tank")
    files = read_manifest(folder / "manifest.json").files
    assert {"case.toml", "history.nc", "handoff/box.nc", "frames/surface.pvd"} <= files.keys()
    assert not files.keys() & {"manifest.json", "log.txt", "checks.json"}
    assert files == checksums(folder, files)


def test_every_file_says_which_version_wrote_it(
    whole: Callable[[str], tuple[Case, Path]],
) -> None:
    _, folder = whole("tank")
    files = {path for path in folder.rglob("*") if path.is_file()}
    # the case is the user's, the checks are a list of verdicts; a checkpoint has its own mark
    for path in files - {folder / "case.toml", folder / "checks.json"}:
        if path.suffix == ".nc":
            with netCDF4.Dataset(path) as file:
                told = str(file.bemwave_version)
        elif path.suffix == ".vtp":
            fields = pyvista.read(path).field_data
            told = str([list(fields[name]) for name in fields])
        else:
            told = path.read_bytes().decode("latin-1")
        assert ("bemwave checkpoint" if path.suffix == ".ckpt" else __version__) in told, path
