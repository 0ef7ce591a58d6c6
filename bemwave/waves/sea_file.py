"""sea.nc: the components of a sea, exactly.

netCDF-4, CF-1.11, float64, one dimension `component`; angles in degrees as in every file. A sea
holds its angles so that the conversion is exact both ways (see `bemwave.waves.sea`).
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

from bemwave import __version__
from bemwave.errors import InputError
from bemwave.waves.sea import Sea, degrees_of

_COMPONENT_VARIABLES = {
    "frequency": ("rad s-1", "angular frequency"),
    "heading": ("degree", "direction of travel, counter-clockwise from +x"),
    "amplitude": ("m", "amplitude of the surface elevation"),
    "phase": ("degree", "phase; elevation = amplitude cos(k.x - w t + phase)"),
    "wavenumber": ("m-1", "wavenumber (radians per metre)"),
}
_SCALARS = {
    "depth": ("m", "water depth; infinite for deep water"),
    "density": ("kg m-3", "water density"),
    "gravity": ("m s-2", "acceleration of gravity"),
    "share": ("1", "share of the spectrum's energy inside the band kept, before rescaling"),
}
_ANGLES = ("heading", "phase")


def write_sea(sea: Sea, path: str | Path) -> None:
    """Write a sea to a netCDF-4 file, replacing what was there."""
    from netCDF4 import Dataset

    with Dataset(path, "w", format="NETCDF4") as file:
        file.Conventions = "CF-1.11"
        file.bemwave_version = __version__
        file.title = "Incident sea as a sum of plane waves"
        file.createDimension("component", sea.count)
        for name, (units, text) in (_COMPONENT_VARIABLES | _SCALARS).items():
            dimensions = ("component",) if name in _COMPONENT_VARIABLES else ()
            variable = file.createVariable(name, "f8", dimensions, fletcher32=bool(dimensions))
            variable.units, variable.long_name = units, text
            value = getattr(sea, name)
            variable[:] = degrees_of(value) if name in _ANGLES else value


def read_sea(path: str | Path) -> Sea:
    """Read a sea back from the file `write_sea` wrote, bit for bit.

    Raises
    ------
    InputError
        If the file is missing, is no netCDF file or lacks a variable of a sea.
    """
    from netCDF4 import Dataset

    try:
        with Dataset(path) as file:
            file.set_auto_mask(False)
            values = {name: file[name][...] for name in (*_COMPONENT_VARIABLES, *_SCALARS)}
    except (OSError, RuntimeError, IndexError) as fault:
        raise InputError(
            f"the sea file {path} cannot be read ({fault}); expected one that a run has written"
        ) from fault
    for name in _ANGLES:
        values[name] = np.radians(values[name])
    scalars = [float(values[name]) for name in _SCALARS]
    return Sea(*(values[name] for name in _COMPONENT_VARIABLES), *scalars)
