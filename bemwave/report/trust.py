"""Can I trust it? The verdicts, the energy ledger, the dispersion of the solved waves."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from bemwave.records import Verdict, read_checks
from bemwave.records.energy import read_energy
from bemwave.report.content import Block, Figures, Material, Notes, Section, Table
from bemwave.report.curves import ledger_figure
from bemwave.report.dispersion import dispersion_figure, measure
from bemwave.report.figures import Figure
from bemwave.report.words import number

_SAID = {
    "energy": "energy that is missing in the ledger, of the largest",
    "volume_flux": "what flows into a box against the growth of its water",
    "divergence": "what flows into small cells of a box and not out",
    "matrix_symmetry": "waves from A at B against waves from B at A",
    "reflection": "what the absorber throws back of the longest waves",
    "dispersion": "error of the solved waves' length",
    "convergence": "difference from a run on panels 1.5 times as large",
}


_STATUS = {
    "running": "is still going,",
    "interrupted": "was interrupted",
    "failed": "stopped with an error",
}


def trust(material: Material) -> Section:
    """The section on trust."""
    verdicts = _verdicts(material)
    figures, notes = [], list(_notes(material))
    ledger = _ledger(material)
    if ledger is not None:
        figures.append(ledger)
    measured = _dispersion(material)
    if isinstance(measured, str):
        notes.append(measured)
    else:
        figures.append(measured)
    blocks: list[Block] = [_table(verdicts)] if verdicts else []
    blocks += [Notes(notes), Figures(figures)]
    short, answer = _answer(material, verdicts)
    return Section("trust", "Can I trust it?", short, answer, blocks)


def _verdicts(material: Material) -> list[Verdict]:
    path = material.run.folder.checks
    finished = material.run.manifest.status == "finished"
    return read_checks(path) if finished and path.exists() else []


def _answer(material: Material, verdicts: Sequence[Verdict]) -> tuple[str, str]:
    judged = [v for v in verdicts if v.verdict != "info"]
    failed = [v.name for v in judged if v.verdict == "fail"]
    if failed:
        return f"{len(failed)} of {len(judged)} checks fail", (
            f"No: {', '.join(failed)} {'is' if len(failed) == 1 else 'are'} over the limit."
        )
    if judged:
        return f"all {len(judged)} checks pass", (
            "As linear theory goes, yes: every check stays within its limit. What linear theory "
            "leaves out is told under the cautions."
        )
    if material.run.manifest.status == "finished" and material.run.history is None:
        return "closed form", (
            "Yes, as linear theory goes: the incident waves are a closed form, and nothing was "
            "solved that could be wrong."
        )
    if material.run.manifest.status == "finished":
        return "not judged", "It has not been judged: `bemwave check` gives the verdicts."
    return "not judged yet", (
        f"Not yet: the run {_STATUS[material.run.manifest.status]} at t = "
        f"{number(material.reached)} s of {material.run.case.run.duration:g} s, and verdicts are "
        "given at its end."
    )


def _table(verdicts: Sequence[Verdict]) -> Table:
    rows = [
        (
            v.name,
            v.verdict,
            "-" if v.figure is None else number(v.figure, 2),
            "-" if v.limit is None else number(v.limit, 2),
            _SAID.get(v.name, ""),
            v.source,
        )
        for v in verdicts
    ]
    head = ("check", "verdict", "figure", "limit", "what it is", "where the limit comes from")
    return Table("The checks: a figure passes when it is at most its limit.", head, rows)


def _notes(material: Material) -> Iterator[str]:
    notes = material.run.manifest.notes
    if material.trusted > 0.0:
        yield (
            f"Trust the record from t = {number(material.trusted)} s on: by then the start-up is "
            "over and solved waves have crossed the useful water. Figures on this page are taken "
            "from there; curves are shaded before it."
        )
    if material.trusted >= material.reached > 0.0:
        yield (
            f"The record ends at t = {number(material.reached)} s, before that: figures on this "
            "page are of the whole record, start-up and all."
        )
    share = float(notes.get("unscattered_share", 0.0))
    if share > 0.0 and material.run.hulls:
        yield (
            f"{100 * share:.2g} % of the sea's energy is in waves too short for the panels: they "
            "pass through bodies as if these were not there."
        )


def _ledger(material: Material) -> Figure | None:
    path = material.run.folder.energy
    if not path.exists():
        return None
    ledger = read_energy(path)
    if len(ledger.times) < 3 or not ledger.energy.any():
        return None
    return ledger_figure(ledger, material.folder)


def _dispersion(material: Material) -> Figure | str:
    """The measured dispersion, or why there is none."""
    run, film = material.run, material.film
    if run.history is None or film is None:
        return (
            "Nothing had to be solved here: the incident waves are closed form and follow the "
            "dispersion relation of linear theory exactly."
        )
    bands = measure(run, film.after(material.trusted))
    if bands:
        return dispersion_figure(run, bands, material.folder)
    forecast = run.manifest.notes.get("dispersion_forecast")
    told = (
        ""
        if forecast is None
        else (
            f" The scheme's own forecast for waves of the peak is an error of "
            f"{100 * float(forecast):.2g} % in frequency."
        )
    )
    return (
        "The dispersion of the solved waves could not be measured in this run: that takes two "
        "dozen records after the start-up, and open water half a wavelength clear of bodies." + told
    )
