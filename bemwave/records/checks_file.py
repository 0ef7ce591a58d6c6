"""checks.json: the verdicts on a run."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Literal

from bemwave.errors import InputError
from bemwave.records.folder import write_whole


@dataclass(frozen=True)
class Verdict:
    """One check: its figure against its limit.

    Attributes
    ----------
    name : str
    figure : what was found; None where there is none.
    limit : what it may be; None where nothing is judged.
    verdict : "pass" | "fail" | "info"
    source : where the limit comes from.
    """

    name: str
    figure: float | None
    limit: float | None
    verdict: Literal["pass", "fail", "info"]
    source: str


def write_checks(verdicts: Sequence[Verdict], path: Path) -> None:
    """Write checks.json."""
    content = [asdict(verdict) for verdict in verdicts]
    text = json.dumps(content, indent=2, allow_nan=False) + "\n"
    write_whole(path, text.encode("utf-8"))


def read_checks(path: Path) -> list[Verdict]:
    """Read checks.json.

    Raises
    ------
    InputError
        If it is missing or damaged.
    """
    try:
        return [Verdict(**entry) for entry in json.loads(path.read_text(encoding="utf-8"))]
    except FileNotFoundError:
        raise InputError(
            f"{path} is missing; expected the verdicts of a finished run: run `bemwave check`"
        ) from None
    except (ValueError, TypeError) as error:
        raise InputError(
            f"{path} is damaged ({error}); expected a list of verdicts: run `bemwave check` again"
        ) from error
