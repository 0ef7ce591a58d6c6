"""One way to write netCDF: CF attributes, units on everything, readable after any interruption.

A file is made at its full size beside its name and renamed into place: all instants stand in
`time`, every record is filled with "none here". From then on records are written in place and
nothing else changes, so that a killed run, a full disk or a loss of power cannot spoil what was
there before. Between writes the file is closed and open to readers. Each write puts the fields
first and sets `written` after them; every stored block has a checksum (HDF5's fletcher32), which
any netCDF reader tries.
"""

from __future__ import annotations

import fcntl
import math
import os
import time as clock
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from bemwave import __version__
from bemwave.errors import InputError, RunError

CONVENTIONS = "CF-1.11"
LEAP_SECONDS = "leap_seconds: none"
RECORDS_PER_WRITE = 8
SECONDS_PER_WRITE = 5.0
PATIENCE = 20.0  # seconds to wait for another program that holds the file
WRITTEN = "written"
_TRIES = 5
_CHUNK = 16_384  # bytes: smaller records are stored several together, larger ones each alone


@dataclass(frozen=True)
class Variable:
    """A variable to be made: name, dimensions, units, what it is, and how it is stored.

    `attributes` adds to units and long_name. Floats of a series are NaN where there is none.
    """

    name: str
    dimensions: tuple[str, ...]
    units: str
    long_name: str
    dtype: str = "f8"
    attributes: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class Layout:
    """What a file of records holds.

    Attributes
    ----------
    dimensions : sizes by name; `time` is added.
    fixed : variables without time, each with its values.
    series : variables over time; their first dimension is `time`.
    attributes : global attributes.
    times : (n,) s, the instants of all records that will be.
    """

    dimensions: Mapping[str, int]
    fixed: Sequence[tuple[Variable, Any]]
    series: Sequence[Variable]
    attributes: Mapping[str, Any]
    times: NDArray[np.float64]


class SeriesFile:
    """A netCDF-4 file that is filled record by record.

    Parameters
    ----------
    path : Path
    layout : Layout
    keep : int, optional
        How many records of an earlier, interrupted writing to keep and go on after; by default
        the file is made anew.

    Raises
    ------
    RunError
        If the file cannot be written, or holds fewer records than are to be kept.

    Examples
    --------
    >>> rate = Variable("flow", ("time",), "m3 s-1", "flow through the gate")
    >>> with SeriesFile(path, Layout({}, [], [rate], {}, times)) as out:   # doctest: +SKIP
    ...     out.append(0.0, {"flow": 2.5})
    """

    def __init__(self, path: Path, layout: Layout, keep: int | None = None) -> None:
        self.path = path
        self._series = {v.name: v for v in layout.series}
        self._times = layout.times
        self._pending: list[Mapping[str, Any]] = []
        self._written = 0 if keep is None else keep
        self._last_write = clock.monotonic()
        if keep is None:
            _create(path, layout)
        else:
            _forget_after(path, keep)

    @property
    def count(self) -> int:
        """Number of records given so far."""
        return self._written + len(self._pending)

    def append(self, time: float, values: Mapping[str, Any]) -> None:
        """Add the record of the next instant, `time` s, with a value for every variable."""
        if values.keys() != self._series.keys():
            raise ValueError(f"{self.path.name} takes {sorted(self._series)}: got {sorted(values)}")
        if not math.isclose(time, self._times[self.count], abs_tol=1e-6):
            raise ValueError(f"{self.path.name} takes {self._times[self.count]} s next: got {time}")
        self._pending.append({k: np.array(v) for k, v in values.items()})
        waited = clock.monotonic() - self._last_write
        if len(self._pending) >= RECORDS_PER_WRITE or waited > SECONDS_PER_WRITE:
            self.flush()

    def flush(self) -> None:
        """Put every record given so far on the disk and close the file."""
        if not self._pending:
            return
        here = slice(self._written, self.count)
        with open_patiently(self.path, "a") as file:
            for name in self._series:
                file[name][here] = np.stack([values[name] for values in self._pending])
            file.sync()
            file[WRITTEN][here] = 1
        self._written = self.count
        self._pending.clear()
        self._last_write = clock.monotonic()

    def close(self) -> None:
        """Write what is pending; the object is not used after that."""
        self.flush()

    def __enter__(self) -> SeriesFile:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()


def open_patiently(path: Path, mode: Literal["r", "a"]) -> Any:
    """Open a netCDF file, waiting a little while another program has it locked.

    Raises
    ------
    RunError
        If it stays locked.
    OSError
        If it is missing or no netCDF file.
    """
    import netCDF4

    give_up, free = clock.monotonic() + PATIENCE, 0
    while True:
        try:
            return netCDF4.Dataset(path, mode)
        except OSError as error:
            # the other may have let go just now: only a file found free again and again is bad
            free += not _locked(path, mode)
            if free > _TRIES:
                raise
            if clock.monotonic() > give_up:
                raise RunError(
                    f"{path} could not be opened ({error}); expected a netCDF file that no other "
                    "program holds open: close it there, then resume the run"
                ) from error
            clock.sleep(0.05)


def _locked(path: Path, mode: str) -> bool:
    """Whether another program holds the lock that HDF5 takes on an open file."""
    try:
        with path.open("rb") as file:
            fcntl.flock(file, fcntl.LOCK_NB | (fcntl.LOCK_SH if mode == "r" else fcntl.LOCK_EX))
    except OSError as error:
        return isinstance(error, BlockingIOError)
    return False


@contextmanager
def reading(path: Path) -> Iterator[Any]:
    """Open a file of a run to read it.

    Raises
    ------
    InputError
        If it is missing or damaged, here or while it is read.
    """
    try:
        with open_patiently(path, "r") as file:
            yield file
    except (OSError, RuntimeError, IndexError, KeyError, ValueError) as error:
        raise InputError(
            f"{path} is missing or damaged ({error}); expected what a run has written: go on with "
            "the run by --resume, or run the case again"
        ) from error


def complete_records(file: Any) -> int:
    """How many records of an open file are complete: those up to the first unwritten one."""
    whole = np.asarray(file[WRITTEN][:]) == 1
    return int(np.argmin(whole)) if not whole.all() else len(whole)


def records_in(path: Path) -> int:
    """How many complete records a file holds; 0 where it is none of records."""
    with open_patiently(path, "r") as file:
        return complete_records(file) if WRITTEN in file.variables else 0


def read_times(file: Any) -> NDArray[np.float64]:
    """Times of the complete records of an open file, s."""
    return np.asarray(file["time"][: complete_records(file)], dtype=np.float64)


def why_not_whole(path: Path, count: int) -> str:
    """Read the first `count` records of a file, trying their checksums; what is wrong, or ""."""
    try:
        with open_patiently(path, "r") as file:
            found = complete_records(file) if WRITTEN in file.variables else 0
            if found < count:
                return f"{path} holds {found} whole records of {count}"
            for variable in file.variables.values():
                if variable.dimensions[:1] != ("time",):
                    variable[...]
                    continue
                for start in range(0, count, RECORDS_PER_WRITE):
                    variable[start : min(start + RECORDS_PER_WRITE, count)]
    except (OSError, RuntimeError, IndexError, KeyError, ValueError) as error:
        return f"{path} is damaged ({error})"
    return ""


def _forget_after(path: Path, keep: int) -> None:
    """Go back to the first `keep` records: those after them count as not written."""
    with open_patiently(path, "a") as file:
        found = complete_records(file)
        if found < keep:
            raise RunError(
                f"{path} holds {found} complete records; the checkpoint was made after {keep}: "
                "the file was changed since; start the run again"
            )
        file[WRITTEN][keep:] = 0


def _create(path: Path, layout: Layout) -> None:
    import netCDF4

    path.parent.mkdir(parents=True, exist_ok=True)
    beside = path.with_name(path.name + ".part")
    beside.unlink(missing_ok=True)
    with netCDF4.Dataset(beside, "w", format="NETCDF4") as file:
        stamp = {"Conventions": CONVENTIONS, "bemwave_version": __version__}
        file.setncatts({**stamp, **layout.attributes})
        for name, size in layout.dimensions.items():
            file.createDimension(name, size)
        for variable, values in layout.fixed:
            _make(file, variable)[:] = values
        if layout.series:
            file.createDimension("time", len(layout.times))
            _make(file, _TIME)[:] = layout.times
            _make_written(file)
        for variable in layout.series:
            _fill(_make(file, variable))
    os.replace(beside, path)


_TIME = Variable(
    "time",
    ("time",),
    "s",
    "time since the start of the run",
    attributes={"units_metadata": LEAP_SECONDS},
)


def _make_written(file: Any) -> None:
    # no checksum: it is written byte by byte, and a torn block must not lose those before
    made = file.createVariable(WRITTEN, "i1", ("time",), contiguous=True)
    made.units = "1"
    made.long_name = "1 where the record is whole, 0 where the run has not come"
    made[:] = 0


def _make(file: Any, variable: Variable) -> Any:
    """Create a variable; its blocks have checksums, and no compression so that none ever moves."""
    if variable.dtype == "str" or not variable.dimensions:
        kind = str if variable.dtype == "str" else variable.dtype
        made = file.createVariable(variable.name, kind, variable.dimensions)
    else:
        sizes = [max(1, len(file.dimensions[name])) for name in variable.dimensions]
        record = math.prod(sizes[1:]) * np.dtype(variable.dtype).itemsize
        series = variable.dimensions[0] == "time"
        rows = min(sizes[0], max(1, _CHUNK // record))
        made = file.createVariable(
            variable.name,
            variable.dtype,
            variable.dimensions,
            fill_value=np.nan if series and variable is not _TIME else None,
            chunksizes=[rows, *sizes[1:]] if series else sizes,
            fletcher32=True,
        )
    made.units = variable.units
    made.long_name = variable.long_name
    made.setncatts(dict(variable.attributes))
    return made


def _fill(made: Any) -> None:
    """Write every block of a series once, so that all have their place on the disk."""
    if made.size:
        rows = made.chunking()[0]
        for start in range(0, len(made), rows):
            made[start : start + rows] = np.nan
