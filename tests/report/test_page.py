"""The page of a run: what stands in it, that it is whole, and that names cannot break it."""

from __future__ import annotations

import base64
import hashlib
import json
import re
import time
import zlib
from collections import Counter
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest

import bemwave
from bemwave import report
from bemwave.cli import status_of
from bemwave.handoff.netcdf import WRITTEN
from bemwave.records import read_manifest, write_manifest
from bemwave.records.manifest import Status
from bemwave.report import write_report

VOID = {"meta", "link", "input", "br", "img", "hr"}


class Reader(HTMLParser):
    """Elements with their attributes, the text of each tag, and whether all are closed in turn."""

    def __init__(self) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.open: list[str] = []
        self.text: dict[str, list[str]] = {}

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if self.open and data.strip():
            self.text.setdefault(self.open[-1], []).append(data.strip())

    def of(self, tag: str) -> list[dict[str, str | None]]:
        return [attributes for name, attributes in self.elements if name == tag]


def read(page: Path) -> Reader:
    reader = Reader()
    reader.feed(page.read_text(encoding="utf-8"))
    reader.close()
    assert reader.open == []
    return reader


def array(text: str, dtype: str) -> Any:
    return np.frombuffer(zlib.decompress(base64.b64decode(text)), dtype=dtype)


def water_of(page: Path) -> dict[str, Any]:
    text = page.read_text(encoding="utf-8")
    data: dict[str, Any] = json.loads(re.search(r'id="view-data">(.*?)</script>', text)[1])  # type: ignore[index]
    return data


def test_the_page_answers_the_readers_questions(page: Path) -> None:
    reader = read(page)
    assert [text for text in reader.text["h2"] if text.endswith("?")] == [
        "Can I trust it?",
        "What does the water do?",
        "What does my box get?",
        "What are the loads?",
        "What is it not for?",
        "What was run?",
    ]
    shown = page.read_text(encoding="utf-8")
    for words in ("deep water", "matrix_symmetry", "route", "netCDF4", "Not for design", "tank"):
        assert words in shown
    assert page.stat().st_size < 10e6


def test_a_title_of_markup_is_shown_as_text(page: Path) -> None:
    reader = read(page)
    assert reader.text["h1"] == ['<script>alert("sea")</script> & <b>waves</b> of $x^2$ & </title>']
    assert len(reader.of("script")) == 2
    assert reader.of("b") == []


def test_the_page_needs_nothing_from_elsewhere(page: Path) -> None:
    reader = read(page)
    for tag, attributes in reader.elements:
        for name in ("src", "href", "xlink:href", "action", "srcset"):
            address = attributes.get(name)
            assert address is None or address.startswith(("#", "data:")), (tag, address)
    text = page.read_text(encoding="utf-8")
    assert not re.search(r"url\(\s*[\"']?(?!#|data:)", re.sub(r"<script>.*?</script>", "", text))
    assert "@import" not in text


def test_its_policy_allows_its_one_script_and_no_address(page: Path) -> None:
    text = page.read_text(encoding="utf-8")
    policy = next(m["content"] for m in read(page).of("meta") if m.get("http-equiv"))
    assert policy is not None
    rules = dict(rule.strip().split(" ", 1) for rule in policy.split(";"))
    script = re.search(r"<script>(.*?)</script>", text, re.DOTALL)
    assert script is not None
    digest = base64.b64encode(hashlib.sha256(script[1].encode()).digest()).decode()
    assert rules["script-src"] == f"'sha256-{digest}'"
    assert rules["default-src"] == "'none'"
    assert rules["img-src"] == "data:"
    assert "connect-src" not in rules  # so it is the default's: none


def test_names_for_those_who_do_not_see(page: Path) -> None:
    reader = read(page)
    ids = Counter(a["id"] for _, a in reader.elements if "id" in a)
    assert max(ids.values()) == 1
    assert {a["href"] for a in reader.of("a")} <= {f"#{name}" for name in ids}
    assert len(reader.of("caption")) == len(reader.of("table"))
    assert all(a.get("scope") in ("row", "col") for a in reader.of("th"))
    assert len(reader.of("figcaption")) == len(reader.of("figure")) > 6
    assert all(a.get("aria-hidden") == "true" for a in reader.of("svg"))
    assert all(a.get("aria-label") for a in reader.of("canvas"))
    assert reader.of("html")[0]["lang"] == "en"


def test_every_figure_is_a_picture_beside_it_too(page: Path) -> None:
    names = {a["id"].removeprefix("figure-") for a in read(page).of("figure") if a.get("id")}  # type: ignore[union-attr]
    pictures = {path.stem for path in (page.parent / "report").glob("*.png")}
    assert pictures == names
    assert {"energy", "closure-tank", "forces-1", "shifts-1", "gauges-1", "elevation-1"} <= names


def test_the_view_holds_the_runs_own_surface(page: Path, finished: Path) -> None:
    water, run = water_of(page), bemwave.open_run(finished)
    heights = array(water["heights"], "<i2").reshape(-1, water["ny"], water["nx"])
    elevation = water["step"] * np.cumsum(heights, axis=2, dtype=np.int64)
    x = np.linspace(*water["x"], water["nx"])
    y = np.linspace(*water["y"], water["ny"])
    wanted = run.elevation(*np.meshgrid(x[::9], y[::9]), water["times"])
    assert len(water["times"]) == len(elevation) > 20
    np.testing.assert_allclose(elevation[:, ::9, ::9], wanted, atol=0.51 * water["step"])
    assert water["step"] < 1e-3 * np.abs(wanted).max()


def test_a_hull_moves_as_it_moved(page: Path, finished: Path) -> None:
    water = water_of(page)
    body, rider = water["bodies"]
    poses = np.array(body["poses"]).reshape(-1, 3, 4)
    with netCDF4.Dataset(finished / "bodies.nc") as file:
        heave = np.interp(water["times"], file["time"][:], file["motion"][:, 0, 2])
    np.testing.assert_allclose(poses[:, 2, 3], heave, atol=1e-5)
    np.testing.assert_allclose(poses[:, :, :3], np.broadcast_to(np.eye(3), (len(poses), 3, 3)))
    points = array(body["points"], "<f4").reshape(-1, 3)
    run = bemwave.open_run(finished)
    (hull,), (mark,) = run.hulls, run.riders
    np.testing.assert_allclose(points, hull.mesh.points, atol=1e-6)
    # a body that rides the surface goes up and down with the water round it
    assert (body["name"], rider["name"]) == (hull.name, mark.name) == ("buoy", "mark")
    assert mark.polygons()[0].mean(axis=0) == pytest.approx([2.0, 1.2], abs=1e-6)
    points = array(rider["points"], "<f4").reshape(-1, 3)
    np.testing.assert_allclose(points, mark.mesh.points, atol=1e-6)
    poses = np.array(rider["poses"]).reshape(-1, 3, 4)
    heave = poses[:, 2] @ [2.0, 1.2, 0.0, 1.0]  # where its middle goes
    level = run.elevation([1.65, 2.35], 1.2, water["times"]).mean(axis=1)
    assert np.std(heave - level) < 0.1 * np.std(level)


def test_the_command_says_where_the_page_is(own: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert status_of(["report", str(own), "--times", "1,2.5"]) == 0
    assert capsys.readouterr().out == f"wrote {own / 'report.html'}\n"
    text = (own / "report.html").read_text(encoding="utf-8")
    assert "The surface at t = 1.00 s." in text
    assert "The surface at t = 2.50 s." in text


def test_what_cannot_be_made_is_refused(own: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (own / "report.html").unlink(missing_ok=True)
    assert status_of(["report", str(own / "nothing")]) == 2
    assert "holds no run" in capsys.readouterr().err
    assert status_of(["report", str(own), "--times", "7"]) == 2
    assert "has records from 0 to 6 s: ask for times between" in capsys.readouterr().err
    assert not (own / "report.html").exists()


def half_way(folder: Path, share: float, status: Status = "interrupted") -> None:
    """Leave a run as an interruption would: later records not written, no verdicts."""
    for path in [*folder.glob("*.nc"), *folder.glob("handoff/*.nc")]:
        with netCDF4.Dataset(path, "a") as file:
            if WRITTEN in file.variables:
                file[WRITTEN][int(share * len(file.dimensions["time"])) :] = 0
    (folder / "checks.json").unlink()
    manifest = folder / "manifest.json"
    write_manifest(read_manifest(manifest).with_status(status), manifest)


def test_the_page_of_an_interrupted_run_says_so(own: Path) -> None:
    half_way(own, 0.5)
    text = write_report(own).read_text(encoding="utf-8")
    assert "the run was interrupted at t = 2.90 s of 6 s" in text
    assert "not judged yet" in text
    assert "its first instant is still to come" not in text  # half its instants are there
    assert len(water_of(own / "report.html")["times"]) >= 15


def test_the_page_of_a_run_that_has_only_begun(own: Path) -> None:
    half_way(own, 0.0, "running")
    page = write_report(own)
    reader = read(page)
    assert reader.of("canvas") == []
    assert len(reader.of("script")) == 0
    text = page.read_text(encoding="utf-8")
    assert "There is no record of it yet." in text
    assert "the run is still going, at t = 0 s of 6 s" in text
    assert "its first instant is still to come" in text


def test_the_page_of_the_sea_alone(sea_alone: Path) -> None:
    text = sea_alone.read_text(encoding="utf-8")
    assert "the incident waves are a closed form" in text
    assert "Nothing had to be solved here" in text
    assert "The case asks for no hand-off" in text
    assert "There are no bodies." in text
    shown = array(water_of(sea_alone)["shown"], "u1")
    assert np.mean(shown) == pytest.approx(np.pi / 4, rel=0.05)  # a circle in its square


@pytest.mark.slow
def test_two_hundred_records_take_no_longer_than_twenty_seconds(tmp_path: Path) -> None:
    root = Path(bemwave.__file__).parents[1]
    case = bemwave.read_case(root / "examples" / "tender_on_panels.toml")
    run = bemwave.run(case, tmp_path / "run")
    assert len(run.times) == 201
    begun = time.perf_counter()
    page = write_report(tmp_path / "run")
    assert time.perf_counter() - begun < 20.0
    assert page.stat().st_size < 10e6


def test_the_bundle_is_that_of_its_sources() -> None:
    view = Path(report.__file__).parent / "view"
    digest = hashlib.sha256()
    for source in [*sorted((view / "src").iterdir()), view / "package-lock.json"]:
        digest.update(source.read_bytes())
    first = (view / "view.js").read_text(encoding="utf-8").splitlines()[0]
    assert first == f"// sources {digest.hexdigest()}", "npm ci && npm run build there"
