"""What is it not for? The limits of the theory and of this run."""

from __future__ import annotations

from collections.abc import Iterator

from bemwave.handoff.writer import CAUTION, PRESSURE_NOTE
from bemwave.report.content import Material, Notes, Section

QUESTION = "What is it not for?"


def cautions(material: Material) -> Section:
    """The section on cautions."""
    answer = "Design and operations, unless qualified practice and the codes that apply say so."
    notes = Notes(list(_notes(material)))
    return Section("cautions", QUESTION, "design, operations", answer, [notes])


def _notes(material: Material) -> Iterator[str]:
    yield CAUTION
    yield (
        "Linear theory takes waves as small beside their length and motions as small beside the "
        "body: no slamming, no green water, no second-order drift or sum-frequency loads, no "
        "viscous damping."
    )
    yield f"Pressures: {PRESSURE_NOTE}."
    yield (
        "Frames for a renderer may carry displaced crests and detail finer than what was solved: "
        "both are for pictures only, never for loads or clearance."
    )
    if "frames" in material.run.manifest.notes:
        yield f"The frames of this run: {material.run.manifest.notes['frames']}."
    yield (
        "The moving sea on this page is for looking: drawn on a coarse grid, heights exaggerated. "
        "Read figures from the tables, or from the run's files."
    )
