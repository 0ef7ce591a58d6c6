"""Incident waves in closed form: dispersion, seas as sums of components, crests. No mesh."""

from bemwave.waves.at_points import SeaAtPoints
from bemwave.waves.dispersion import (
    group_speed,
    irregular_wave_power,
    phase_speed,
    wave_power,
    wavelength,
    wavenumber,
    wavenumber_of_frequency,
)
from bemwave.waves.sea import Sea

__all__ = [
    "Sea",
    "SeaAtPoints",
    "group_speed",
    "irregular_wave_power",
    "phase_speed",
    "wave_power",
    "wavelength",
    "wavenumber",
    "wavenumber_of_frequency",
]
