"""What the case format knows and this version does not do: one line each, taken out when done."""

from __future__ import annotations

from collections.abc import Iterator

from bemwave.case.model import Case
from bemwave.errors import NotYetError


def refuse_not_yet(case: Case) -> None:
    """Raise for the first thing in a case that this version cannot do.

    Raises
    ------
    NotYetError
        Names the key, its value and what to write instead.
    """
    for key, advice in _not_yet(case):
        raise NotYetError(f"not yet: {key} comes with a later version; {advice}")


def _not_yet(case: Case) -> Iterator[tuple[str, str]]:
    if any(case.water.current):
        yield "[water] current", "take it out"
    for body in case.body:
        where = f'[[body]] "{body.name}"'
        if body.path != "fixed":
            yield f"{where} path other than fixed", 'write path = "fixed"'
        if body.attitude == "floating":
            yield f'{where} attitude = "floating"', 'write attitude = "fixed" or "forced"'
        if body.thin:
            yield f"{where} thin", "take it out"
    yield from _handoff_not_yet(case)


def _handoff_not_yet(case: Case) -> Iterator[tuple[str, str]]:
    for handoff in case.handoff:
        where = f'[[handoff]] "{handoff.name}"'
        if handoff.body is not None:
            yield f'{where} axes = "{handoff.axes}"', 'write axes = "earth"'
        if handoff.format != "netcdf":
            yield f'{where} format = "{handoff.format}"', 'write format = "netcdf"'
        if handoff.layout != "points":
            yield f'{where} layout = "{handoff.layout}"', 'write layout = "points"'
        for switch in ("average", "balance"):
            if getattr(handoff, switch):
                yield f"{where} {switch} = true", "take it out"
