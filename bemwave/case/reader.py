"""Reading a case file; what is wrong with it is told with the line it stands on."""

from __future__ import annotations

import os
import tomllib
from pathlib import Path
from typing import Any

from bemwave.case.faults import CaseFaults, sentence
from bemwave.case.lines import line_of_keys, nearest_line
from bemwave.case.model import Case
from bemwave.errors import InputError

LARGEST = 10_000_000  # bytes; a case is some kilobytes, so a larger file is another thing


def read_case(path: str | os.PathLike[str]) -> Case:
    """Read and check a case file.

    Parameters
    ----------
    path : str or path
        A TOML file. The files it names are looked for from its own folder.

    Returns
    -------
    Case

    Raises
    ------
    InputError
        If it cannot be read or anything in it is wrong: a line for each fault, with the line of
        the file, the key, what was given and what was expected.
    """
    path = Path(path)
    text = _text_of(path)
    tables = _parse(text, path)
    try:
        case = Case(**tables)
    except CaseFaults as error:
        raise InputError(_with_lines(error, text, tables, path)) from None
    case._folder, case._text = path.parent, text
    return case


def _text_of(path: Path) -> str:
    try:
        with path.open("rb") as file:
            content = file.read(LARGEST + 1)
        if len(content) > LARGEST:
            limit = f"TOML text of at most {LARGEST / 1e6:.0f} MB"
            raise InputError(f"{path}: got a file too large, expected a case file ({limit})")
        return content.decode("utf-8-sig").replace("\r\n", "\n")
    except FileNotFoundError:
        raise InputError(
            f"{path}: there is no such file; write one with: bemwave new FOLDER"
        ) from None
    except IsADirectoryError:
        raise InputError(
            f"{path}: got a folder, expected a case file; try {path / 'case.toml'}"
        ) from None
    except UnicodeDecodeError as error:
        raise InputError(
            f"{path}: byte {error.start} is not UTF-8, expected a case file (TOML text in UTF-8)"
        ) from None
    except OSError as error:
        raise InputError(f"{path}: cannot be read: {error.strerror}") from None


def _parse(text: str, path: Path) -> dict[str, Any]:
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        what, _, place = str(error).rpartition(" (at ")
        where = place.rstrip(")").split(",")[0] if what else "its end"
        raise InputError(f"{path} {where}: not TOML: {what or error}") from None
    except RecursionError:
        raise InputError(f"{path}: lists or tables nested too deeply for a case file") from None


def _with_lines(error: CaseFaults, text: str, tables: dict[str, Any], path: Path) -> str:
    lines = line_of_keys(text)
    told = []
    for fault in error.faults:
        line = nearest_line(lines, fault.path)
        where = f"{path} line {line}" if line else str(path)
        told.append((line or 0, f"{where}: {sentence(fault, tables)}"))
    return "\n".join(text for _, text in sorted(told))
