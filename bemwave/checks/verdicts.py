"""The verdicts on a run, from what stands in its folder."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from bemwave.checks.dispersion import dispersion_verdict
from bemwave.handoff.closure import closure_figure
from bemwave.handoff.divergence import divergence_figure
from bemwave.handoff.netcdf import read_times, reading
from bemwave.records import Run, Verdict
from bemwave.records.energy import read_energy

PRACTICE = "common practice, no source"


def judge(run: Run) -> list[Verdict]:
    """All verdicts that a run's folder allows."""
    return [
        *_energy(run),
        *_balance(
            run, "volume_flux", ("net_flux", "volume_rate", "largest_face_flux"), closure_figure
        ),
        *_balance(run, "divergence", ("cell_net_flux", "cell_face_flux"), divergence_figure),
        *_from_manifest(run),
        *dispersion_verdict(run),
    ]


def judged(name: str, figure: float, limit: float, source: str) -> Verdict:
    """A figure against the most it may be."""
    return Verdict(name, figure, limit, "pass" if figure <= limit else "fail", source)


def _energy(run: Run) -> Iterator[Verdict]:
    """Energy now against what came in less what the absorber took, over the largest of them."""
    path = run.folder.energy
    if not path.exists():
        return
    ledger = read_energy(path)
    if len(ledger.times) < 3 or not ledger.energy.any():
        return
    figure = float(np.abs(ledger.missing).max())
    yield judged("energy", figure, 0.02, f"conservation of energy; limit {PRACTICE}")


def _balance(
    run: Run, name: str, variables: tuple[str, ...], figure_of: Callable[..., float]
) -> Iterator[Verdict]:
    """The worst hand-off's balance over all its instants."""
    figures = []
    for handoff in run.case.handoff:
        path = run.folder.handoff / f"{handoff.name}.nc"
        if handoff.box is None or not path.exists():
            continue
        with reading(path) as file:
            count = len(read_times(file))
            figures.append(figure_of(*(np.asarray(file[v][:count]) for v in variables)))
    if figures:
        yield judged(name, max(figures), 0.01, f"conservation of mass; limit {PRACTICE}")


def _from_manifest(run: Run) -> Iterator[Verdict]:
    """What was measured or forecast while the run was set up."""
    notes = run.manifest.notes
    if "matrix_symmetry" in notes:
        figure = float(notes["matrix_symmetry"])
        yield judged("matrix_symmetry", figure, 1e-12, "reciprocity (Green's second identity)")
    if "reflection" in notes:
        figure = float(notes["reflection"])
        yield judged("reflection", figure, 0.02, f"one-dimensional forecast; limit {PRACTICE}")
