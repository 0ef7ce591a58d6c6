"""Incident waves in closed form: dispersion, seas as sums of components, crests. No mesh."""

from bemwave.waves.above_band import sea_above_band
from bemwave.waves.at_points import SeaAtPoints, depth_factors
from bemwave.waves.crest import (
    CrestRule,
    SeaUnderCrests,
    extrapolated,
    is_wet,
    pressure_under_crest,
    stretched_z,
)
from bemwave.waves.dispersion import (
    group_speed,
    irregular_wave_power,
    phase_speed,
    wave_power,
    wavelength,
    wavenumber,
    wavenumber_of_frequency,
)
from bemwave.waves.making import make_sea
from bemwave.waves.sea import Sea
from bemwave.waves.sea_file import read_sea, write_sea
from bemwave.waves.spectra import (
    jonswap,
    jonswap_normaliser,
    pierson_moskowitz,
    spectral_moment,
    tma,
    tma_depth_factor,
)
from bemwave.waves.spreading import spreading_density, spreading_quantile

__all__ = [
    "CrestRule",
    "Sea",
    "SeaAtPoints",
    "SeaUnderCrests",
    "depth_factors",
    "extrapolated",
    "group_speed",
    "irregular_wave_power",
    "is_wet",
    "jonswap",
    "jonswap_normaliser",
    "make_sea",
    "phase_speed",
    "pierson_moskowitz",
    "pressure_under_crest",
    "read_sea",
    "sea_above_band",
    "spectral_moment",
    "spreading_density",
    "spreading_quantile",
    "stretched_z",
    "tma",
    "tma_depth_factor",
    "wave_power",
    "wavelength",
    "wavenumber",
    "wavenumber_of_frequency",
    "write_sea",
]
