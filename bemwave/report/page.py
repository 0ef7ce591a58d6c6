"""report.html: one self-contained page about a run."""

from __future__ import annotations

import base64
import hashlib
import os
from collections.abc import Sequence
from pathlib import Path

from bemwave import __version__
from bemwave.errors import InputError
from bemwave.records import open_run
from bemwave.records.folder import write_whole
from bemwave.report.boxes import boxes
from bemwave.report.cautions import cautions
from bemwave.report.colours import THEME
from bemwave.report.content import Material, Section
from bemwave.report.loads import loads
from bemwave.report.sea import sea
from bemwave.report.setup import setup
from bemwave.report.trust import trust

_HERE = Path(__file__).parent
_SECTIONS = (trust, sea, boxes, loads, cautions, setup)


def write_report(path: str | os.PathLike[str], times: Sequence[float] = ()) -> Path:
    """Write RUN/report.html, and its figures as RUN/report/*.png.

    Also of a run that still goes on or was interrupted: of what is there by then.

    Parameters
    ----------
    path : the run folder.
    times : for the maps of the elevation, s; by default the highest crest's and the last.

    Returns
    -------
    Path
        The page.

    Raises
    ------
    InputError
        If the folder holds no run, or a time is outside its record.

    Examples
    --------
    >>> write_report("examples/tender_by_platform-run")      # doctest: +SKIP
    PosixPath('examples/tender_by_platform-run/report.html')
    """
    run = open_run(Path(path))
    folder = run.folder.figures
    material = Material(run, folder, tuple(times))
    for time in times:
        if not 0.0 <= time <= material.reached:
            raise InputError(
                f"a map at t = {time:g} s was asked for; {run.folder.path} has records from 0 to "
                f"{material.reached:g} s: ask for times between"
            )
    folder.mkdir(exist_ok=True)
    for old in folder.glob("elevation-*.png"):  # there may be fewer of them now
        old.unlink()
    write_whole(run.folder.page, _page(material).encode("utf-8"))
    return run.folder.page


def _page(material: Material) -> str:
    from jinja2 import Environment, FileSystemLoader, StrictUndefined
    from markupsafe import Markup

    environment = Environment(
        loader=FileSystemLoader(_HERE),
        autoescape=True,  # titles and names come from the case and are not to be trusted
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    sections = [make(material) for make in _SECTIONS]
    script = (_HERE / "view" / "view.js").read_text(encoding="utf-8")
    manifest = material.run.manifest
    return environment.get_template("page.html").render(
        title=material.run.case.title or material.run.folder.path.resolve().name,
        version=__version__,
        status=manifest.status,
        started=manifest.started.replace("T", " ").removesuffix("+00:00") + " UTC",
        sections=sections,
        style=Markup(_style()),
        script=Markup(script) if _has_view(sections) else None,
        policy=_policy(script),
    )


def _has_view(sections: Sequence[Section]) -> bool:
    return any(block.kind == "sea" for section in sections for block in section.blocks)


def _style() -> str:
    """The page's own style with the colours of light and dark."""
    light = "".join(f"--{name}:{pair[0]};" for name, pair in THEME.items())
    dark = "".join(f"--{name}:{pair[1]};" for name, pair in THEME.items())
    colours = f":root{{{light}}}@media (prefers-color-scheme: dark){{:root{{{dark}}}}}\n"
    return colours + (_HERE / "page.css").read_text(encoding="utf-8")


def _policy(script: str) -> str:
    """What the page may do: run its one script and show its own pictures, nothing else."""
    digest = base64.b64encode(hashlib.sha256(script.encode("utf-8")).digest()).decode("ascii")
    return (
        f"default-src 'none'; script-src 'sha256-{digest}'; style-src 'unsafe-inline'; "
        "img-src data:; base-uri 'none'; form-action 'none'"
    )
