"""While a run goes on: another into its folder is refused, and its page can be made, and again."""

from __future__ import annotations

import subprocess
import time
from pathlib import Path

import pytest

from tests.restart.cases import GRID_HUMP, TANK, assert_same, command, wait_for

LONG = {
    name: text.partition("[frames]")[0].replace("duration = 4.0", "duration = 160.0")
    for name, text in {
        "panels": TANK,
        "grid": GRID_HUMP.replace("3.0\nevery", "159.0\nevery"),
    }.items()
}


def ended(running: subprocess.Popen[str]) -> tuple[int, str]:
    _, told = running.communicate(timeout=300)
    return running.returncode, told


@pytest.mark.slow
@pytest.mark.parametrize("route", LONG)
def test_another_run_is_refused_and_the_page_is_made(route: str, tmp_path: Path) -> None:
    (tmp_path / "case.toml").write_text(LONG[route])
    folder = tmp_path / "run"
    with command("run", "case.toml", "--out", "run", cwd=tmp_path) as running:
        wait_for(folder / "log.txt", "set up in", running)
        for more in ((), ("--resume",)):
            status, told = ended(command("run", "case.toml", "--out", "run", *more, cwd=tmp_path))
            assert running.poll() is None
            assert status == 2
            assert "is in use by another run" in told or "already holds a run" in told
        pages = 0
        while running.poll() is None and pages < 2:
            (folder / "report.html").unlink(missing_ok=True)
            assert ended(command("report", "run", cwd=tmp_path)) == (0, "")
            assert (folder / "report.html").stat().st_size > 100_000
            pages += running.poll() is None
            time.sleep(0.2)
        assert pages > 0
        assert ended(running) == (0, "")
    assert ended(command("run", "case.toml", "--out", "alone", cwd=tmp_path)) == (0, "")
    for page in (folder / "report.html", *(folder / "report").glob("*")):
        page.unlink()
    (folder / "report").rmdir()
    assert_same(tmp_path / "alone", folder)
