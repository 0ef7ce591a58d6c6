"""Mutates mesh files of every format and reads each in a process of its own.

Run as `python -m tests.round_trip.hostile_meshes COUNT SEED FOLDER`; prints what did not end in a
mesh or in words within ten seconds and a gigabyte, and leaves those files in the folder.
"""

from __future__ import annotations

import contextlib
import io
import os
import re
import resource
import signal
import sys
from collections import Counter
from collections.abc import Iterator
from pathlib import Path

import meshio
import numpy as np

from bemwave.errors import InputError
from bemwave.geometry.files import read_mesh, write_mesh
from bemwave.geometry.surface_mesh import SurfaceMesh

SECONDS, KILOBYTES = 10, 1_500_000
NUMBERS = [
    *(b"-1", b"0", b"99999999999", b"4294967295", b"1e308", b"nan", b"2147483648"),
    *(b"18446744073709551615", b"1000000000"),
]


def originals(home: Path) -> Iterator[tuple[str, bytes]]:
    """A small mesh in every format and variant: ending and content."""
    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1.0]])
    triangles = np.array([[0, 2, 1], [0, 1, 3], [1, 2, 3], [0, 3, 2]])
    mesh = SurfaceMesh(points, triangles, np.array([0, 0, 1, 1]), ("hull", "keel"))
    for kind in ("stl", "obj", "ply", "vtu", "msh", "vtp"):
        write_mesh(mesh, home / f"a.{kind}")
        yield kind, (home / f"a.{kind}").read_bytes()
    write_mesh(mesh, home / "a.stl", text=True)
    yield "stl", (home / "a.stl").read_bytes()
    plain = meshio.Mesh(points, [("triangle", triangles.astype(np.int32))])
    with contextlib.redirect_stderr(io.StringIO()), contextlib.redirect_stdout(io.StringIO()):
        meshio.ply.write(home / "b.ply", plain, binary=False)
        yield "ply", (home / "b.ply").read_bytes()
        for version, binary in (("2.2", False), ("4.1", True), ("4.1", False)):
            meshio.gmsh.write(home / "b.msh", plain, fmt_version=version, binary=binary)
            yield "msh", (home / "b.msh").read_bytes()
        meshio.vtu.write(home / "b.vtu", plain, binary=False)
        yield "vtu", (home / "b.vtu").read_bytes()


def mutated(content: bytes, rng: np.random.Generator) -> bytes:
    """Cut off, with bits flipped, a piece cut out or repeated, or with an absurd number."""
    changed = bytearray(content)
    first, last = sorted(int(place) for place in rng.integers(0, len(changed), 2))
    match rng.integers(6):
        case 0:
            return bytes(changed[:last])
        case 1:
            for place in rng.integers(0, len(changed), rng.integers(1, 8)):
                changed[place] ^= 1 << int(rng.integers(8))
        case 2:
            del changed[first:last]
        case 3:
            changed[first : first + 4] = b"\xff" * 4
        case 4:
            found = list(re.finditer(rb"\d+", content))
            chosen = found[rng.integers(len(found))]
            changed[chosen.start() : chosen.end()] = NUMBERS[rng.integers(len(NUMBERS))]
        case _:
            changed[last:last] = changed[first:last] * int(rng.integers(1, 50))
    return bytes(changed)


def read_alone(path: Path) -> str:
    """How reading ends: "read", "refused", or what it should not."""
    child = os.fork()
    if child == 0:
        signal.alarm(SECONDS)
        silence = os.open(os.devnull, os.O_WRONLY)
        os.dup2(silence, 1)
        os.dup2(silence, 2)
        try:
            mesh = read_mesh(path)
            mesh.normals  # noqa: B018  # every corner is a point that is there
            code = 0
        except InputError:
            code = 1
        except BaseException:
            code = 3
        used = max(resource.getrusage(w).ru_maxrss for w in (0, resource.RUSAGE_CHILDREN))
        os._exit(4 if used > KILOBYTES else code)
    _, status = os.waitpid(child, 0)
    if os.WIFSIGNALED(status):
        return "hang" if os.WTERMSIG(status) == signal.SIGALRM else "crash"
    return {0: "read", 1: "refused", 4: "memory"}.get(os.WEXITSTATUS(status), "traceback")


def main(count: int, seed: int, home: Path) -> int:
    rng, ends = np.random.default_rng(seed), Counter[str]()
    variants = list(originals(home))
    for trial in range(count):
        kind, content = variants[trial % len(variants)]
        path = home / f"{trial}.{kind}"
        path.write_bytes(mutated(content, rng))
        end = read_alone(path)
        ends[end] += 1
        if end in ("read", "refused"):
            path.unlink()
        else:
            print(f"{end}: {path}")
    print(dict(ends))
    return 0 if ends.keys() <= {"read", "refused"} else 1


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]), int(sys.argv[2]), Path(sys.argv[3])))
