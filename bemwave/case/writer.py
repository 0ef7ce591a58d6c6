"""A case made in Python, written as TOML."""

from __future__ import annotations

import json
import math
import re
from typing import Any

_bare = re.compile(r"[A-Za-z0-9_-]+")


def to_toml(tables: dict[str, Any]) -> str:
    """The TOML text of a case's tables.

    Parameters
    ----------
    tables : dict
        Keys at the top to values, tables (dict) or repeated tables (lists or tuples of dict).
    """
    lines = [f"{key} = {_value(value)}" for key, value in tables.items() if not _is_table(value)]
    for name, value in tables.items():
        if isinstance(value, dict):
            lines += ["", f"[{name}]", *_entries(value)]
        elif _is_table(value):
            for entry in value:
                lines += ["", f"[[{name}]]", *_entries(entry)]
    return "\n".join(lines).strip() + "\n"


def _is_table(value: object) -> bool:
    if isinstance(value, list | tuple):
        return all(isinstance(entry, dict) for entry in value)
    return isinstance(value, dict)


def _entries(table: dict[str, Any]) -> list[str]:
    return [f"{_key(key)} = {_value(value)}" for key, value in table.items()]


def _key(key: str) -> str:
    return key if _bare.fullmatch(key) else _text(key)


def _value(value: object) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return _text(value)
    if isinstance(value, float) and math.isinf(value):
        return '"deep"'  # only a depth may be infinite
    if isinstance(value, list | tuple):
        return "[" + ", ".join(_value(entry) for entry in value) + "]"
    if isinstance(value, dict):
        return "{ " + ", ".join(_entries(value)) + " }"
    return repr(value)


def _text(value: str) -> str:
    # the escapes of JSON are those of TOML, which forbids DEL besides
    return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007f")
