"""What is wrong with a case, said in words: a list of faults, each with its place.

A `Fault` knows the path of its key, such as ("body", 0, "draught"); only the reader knows lines.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any, Literal, get_args, get_origin

from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo
from pydantic.functional_validators import WrapValidator
from pydantic_core import ErrorDetails, PydanticCustomError

from bemwave.errors import InputError

Path = tuple[str | int, ...]

# sizes of a case's numbers, in whatever unit: beyond them squares and products overflow
SMALLEST, LARGEST = 1e-12, 1e15


@dataclass(frozen=True)
class Fault:
    """One thing that is wrong: where (path of keys and indices), and the sentence about it."""

    path: Path
    text: str


class CaseFaults(InputError):
    """The case is wrong; `faults` lists each thing that is, for a caller who knows the lines."""

    def __init__(self, faults: list[Fault], table: dict[str, Any]) -> None:
        self.faults = faults
        super().__init__("\n".join(f"case: {sentence(fault, table)}" for fault in faults))


def sentence(fault: Fault, table: dict[str, Any]) -> str:
    """A fault with its key spelt as in the file: `[surface] spacing: got 0, expected ...`."""
    place = spell(fault.path, table)
    return f"{place}: {fault.text}" if place else fault.text


def spell(path: Path, table: dict[str, Any]) -> str:
    """The path of a key as one would write it: [surface] spacing, [[body]] "tender" draught."""
    if not path:
        return ""
    head, rest = str(path[0]), path[1:]
    entries = table.get(head)
    if rest and isinstance(rest[0], int):
        words = f"[[{head}]]{_which(entries, rest[0])}"
        rest = rest[1:]
    elif _is_tables(entries):
        words = f"[[{head}]]"
    else:
        words = f"[{head}]" if rest or isinstance(entries, dict | BaseModel) else head
    keys = ".".join(str(part) for part in rest)
    return f"{words} {keys}" if keys else words


def _is_tables(value: object) -> bool:
    return isinstance(value, list | tuple) and all(isinstance(v, dict | BaseModel) for v in value)


def _which(entries: object, index: int) -> str:
    if not isinstance(entries, list | tuple) or len(entries) < 2:
        return ""
    entry = entries[index]
    name = entry.get("name") if isinstance(entry, dict) else getattr(entry, "name", None)
    return f' "{name}"' if isinstance(name, str) and name else f" number {index + 1}"


def expecting(text: str) -> WrapValidator:
    """Let every failure of the annotated type read `got ..., expected <text>`."""

    def check(value: Any, inner: Callable[[Any], Any]) -> Any:
        try:
            return inner(value)
        except ValidationError:
            raise PydanticCustomError("expected", "{text}", {"text": text}) from None

    check.text = text  # type: ignore[attr-defined]  # read again for a missing key
    return WrapValidator(check)


def refuse(faults: Iterable[Fault]) -> None:
    """Raise the faults found by a check of several keys; nothing happens if there are none."""
    found = list(faults)
    if found:
        raise PydanticCustomError("faults", "faults", {"faults": found})


def shown(value: object) -> str:
    """A value as a case file writes it, shortened."""
    if isinstance(value, bool):
        text = str(value).lower()
    elif isinstance(value, str):
        text = f'"{value}"'
    elif isinstance(value, list | tuple):
        text = "[" + ", ".join(shown(entry) for entry in value) + "]"
    elif isinstance(value, dict | BaseModel):
        return "a table"
    else:
        text = str(value)
    return text if len(text) <= 60 else text[:57] + "..."


def did_you_mean(word: object, known: Iterable[str]) -> str | None:
    """The nearest known word, or None if none is near."""
    near = get_close_matches(str(word).lower(), list(known), n=1, cutoff=0.6)
    return near[0] if near else None


def faults_of(error: ValidationError, root: type[BaseModel]) -> list[Fault]:
    """Turn the errors of pydantic into faults in our own words."""
    return [
        fault
        for entry in error.errors(include_url=False)
        if entry["type"] != "default_factory_not_called"  # follows from another fault
        for fault in _translate(entry, root)
    ]


def _translate(entry: ErrorDetails, root: type[BaseModel]) -> list[Fault]:
    # parts in angle brackets are pydantic's tags of a union, no keys of the file
    path = tuple(part for part in entry["loc"] if not str(part).startswith("<"))
    kind, given, context = entry["type"], entry["input"], entry.get("ctx", {})
    if kind == "faults":
        return [Fault(path + fault.path, fault.text) for fault in context["faults"]]
    if kind == "expected":
        text = f"got {shown(given)}, expected {context['text']}{_size(given)}"
    elif kind == "missing":
        text = _missing(path, root)
    elif kind == "extra_forbidden":
        text = _unknown(path, root)
    elif kind == "literal_error":
        text = _wrong_word(given, context["expected"])
    elif kind == "tuple_type":
        text = f"got {_one_table(path, given)}, expected a list of tables, each under [[{path[0]}]]"
    elif kind in ("model_type", "dict_type"):
        text = _no_table(path, given)
    else:
        text = f"got {shown(given)}: {entry['msg']}"
    return [Fault(path, text)]


def _size(given: object) -> str:
    """What else to say of a number that is absurd."""
    numbers = given if isinstance(given, list | tuple) else [given]
    sizes = [abs(n) for n in numbers if isinstance(n, int | float) and n]
    if any(size < SMALLEST or LARGEST < size < math.inf for size in sizes):
        return f", and no number smaller than {SMALLEST:g} or larger than {LARGEST:g}"
    return ""


def _missing(path: Path, root: type[BaseModel]) -> str:
    field = model_at(root, path[:-1]).model_fields[str(path[-1])]
    expected = _expected(field)
    if len(path) == 1 and expected == "a table":
        model = _model_of(field.annotation)
        needed = ", ".join(k for k, f in model.model_fields.items() if f.is_required())
        return f"missing; expected a table [{path[0]}] with {needed}"
    return f"missing; expected {expected}"


def _expected(field: FieldInfo) -> str:
    for mark in reversed(field.metadata):
        text = getattr(getattr(mark, "func", None), "text", None)
        if isinstance(text, str):
            return text
    if get_origin(field.annotation) is Literal:
        return _either([f'"{word}"' for word in get_args(field.annotation)])
    return "a table"


def _either(words: list[str]) -> str:
    return words[0] if len(words) == 1 else ", ".join(words[:-1]) + " or " + words[-1]


def _unknown(path: Path, root: type[BaseModel]) -> str:
    model = model_at(root, path[:-1])
    near = did_you_mean(path[-1], model.model_fields)
    if near is None:
        return f"unknown key; the keys here are {', '.join(model.model_fields)}"
    if len(path) > 1:
        return f'unknown key, did you mean "{near}"?'
    annotation = model.model_fields[near].annotation
    if _find_model(annotation) is None:
        return f'unknown key, did you mean "{near}"?'
    return f"unknown table, did you mean {_header(near, annotation)}?"


def _header(name: str, annotation: Any) -> str:
    return f"[[{name}]]" if get_origin(annotation) is tuple else f"[{name}]"


def _wrong_word(given: object, expected: str) -> str:
    words = expected.replace("'", '"')
    near = did_you_mean(given, words.split('"')[1::2]) if given else None
    hint = f'; did you mean "{near}"?' if near else ""
    return f"got {shown(given)}, expected {words}{hint}"


def _one_table(path: Path, given: object) -> str:
    return f"one table [{path[0]}]" if isinstance(given, dict) else shown(given)


def _no_table(path: Path, given: object) -> str:
    if len(path) == 1 and isinstance(given, list):
        return f"got a list of tables [[{path[0]}]], expected one table [{path[0]}]"
    return f"got {shown(given)}, expected a table"


def model_at(root: type[BaseModel], path: Path) -> type[BaseModel]:
    """The model of the table at a path of keys and indices."""
    model = root
    for part in path:
        if isinstance(part, str):
            model = _model_of(model.model_fields[part].annotation)
    return model


def _model_of(annotation: Any) -> type[BaseModel]:
    model = _find_model(annotation)
    assert model is not None, "only tables hold keys"
    return model


def _find_model(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    for part in get_args(annotation):
        found = _find_model(part)
        if found is not None:
            return found
    return None
