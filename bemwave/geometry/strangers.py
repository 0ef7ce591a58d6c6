"""Files from strangers: what a mesh library is never given, and how much memory it may take."""

from __future__ import annotations

import re
import resource
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from bemwave.errors import InputError

MOST_BYTES = 2_000_000_000  # of a file; a hull of a million triangles has a hundred million
_XML = (".vtu", ".vtp")
_MOST_COUNTED = 50_000_000  # points or cells; far more than can be solved
_MOST_FOLDED = 1100  # a byte of a compressed file stands for no more (zlib)
_MEMORY = 1_000_000_000, 60  # bytes, and for each byte of the file


def refuse_hostile(path: Path) -> None:
    """Look through a mesh file before a library does.

    Raises
    ------
    InputError
        If it is absurdly large, defines XML entities, or announces more than it can hold.
    """
    size = path.stat().st_size
    if size > MOST_BYTES:
        raise InputError(
            f"{path} has {size / 1e9:.1f} GB; expected a mesh of at most "
            f"{MOST_BYTES / 1e9:.0f} GB: thin it out in a mesh program first"
        )
    if path.suffix.lower() in _XML:
        _refuse_hostile_xml(path, size)


def _refuse_hostile_xml(path: Path, size: int) -> None:
    text = path.read_bytes()
    # the rest of the format is ASCII in every encoding that its readers take
    if b"<!DOCTYPE" in text or b"<!ENTITY" in text or text[:2] in (b"\xff\xfe", b"\xfe\xff"):
        raise InputError(
            f"{path} defines XML entities or is not ASCII or UTF-8, which no mesh needs; expected "
            "a plain VTK file: write it out again"
        )
    most = min(_MOST_COUNTED, _MOST_FOLDED * size)
    for name, count in re.findall(rb"(Number[Oo]f\w+)\s*=\s*[\"']\s*([+-]?\d+)", text):
        if not 0 <= int(count[:20]) <= most:
            raise InputError(
                f"{path} announces {name.decode()} = {count[:20].decode()} in {size} bytes: it is "
                "cut off or damaged; write it out again"
            )


@contextmanager
def memory_bounded(path: Path) -> Iterator[None]:
    """Let a library take some memory for a file, and no more: MemoryError tells of a bomb.

    Where the system does not say how much is in use, nothing is bounded.
    """
    try:
        pages = int(Path("/proc/self/statm").read_text().split()[0])
    except (OSError, ValueError):
        yield
        return
    base, factor = _MEMORY
    allowed = pages * resource.getpagesize() + base + factor * path.stat().st_size
    soft, hard = resource.getrlimit(resource.RLIMIT_AS)
    if soft != resource.RLIM_INFINITY:
        allowed = min(allowed, soft)
    resource.setrlimit(resource.RLIMIT_AS, (allowed, hard))
    try:
        yield
    finally:
        resource.setrlimit(resource.RLIMIT_AS, (soft, hard))
