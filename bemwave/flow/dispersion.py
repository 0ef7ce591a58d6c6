"""How much faster or slower than real ones the scheme's own waves run: a forecast from panel size.

The scheme is exact in time and, on hulls, has no waves; what spoils a wave is the water sheet's
panels. On a periodic sheet of panels a wave keeps its wavenumber k but carries with it harmonics
k + m, m over the sheet's reciprocal lattice, and the flow map acts on it as a number, the symbol,
that stands in for k tanh kh. With a = hat's transform, e = exp(-2 |k| h), and all sums over
harmonics,

    open water:    sum |k| tanh(|k| h) |a|^2 / sum |a|^2
    closed water:  (sum |k| (1 - e)/2 |a|^2 + R* V^-1 R) / sum |a|^2
                   R_t = sum (1 - e)/2 a conj(b_t),  V_tu = sum (1 + e)/(2 |k|) conj(b_t) b_u

where b_1, b_2 are the transforms of a cell's two triangles, on which the closed water's flux is
uniform. Both follow from `flow.panels` by Poisson's summation; the idea of judging a panel
method by its symbol is that of Nakos & Sclavounos (1990), J. Fluid Mech. 215, 263-296.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from bemwave.errors import InputError
from bemwave.waves.dispersion import double_depth_ratio

Array = npt.NDArray[np.float64]

HARMONICS = 24  # kept each way; the rest change the forecast error by less than a thousandth
HEADINGS = np.radians(np.arange(0.0, 180.0, 15.0))


def frequency_error(
    wavelength: float,
    spacing: float,
    depth: float = math.inf,
    *,
    closed: bool = False,
    structured: bool = True,
    heading: float | None = None,
) -> float:
    """Relative error of the frequency of the scheme's free waves, d(w)/w.

    Parameters
    ----------
    wavelength : m.
    spacing : edge length asked for where the wave runs, m.
    depth : m, or math.inf.
    closed : whether walls close the water all round, so that the flux on it is an unknown.
    structured : squares with all diagonals the same way, which lie along heading 45 degrees; if
        not, the mesher's triangles, taken to be equilateral (so they are but for a few; measured
        errors agree within a tenth), which treat all headings nearly alike.
    heading : rad; None for the one with the largest error.

    Returns
    -------
    Positive where the scheme's waves are too fast. About (spacing/wavelength)^3.

    Raises
    ------
    InputError
        If the panels are too large to carry the wave at all.

    Examples
    --------
    >>> round(100 * frequency_error(12.0, 1.0, heading=0.0), 3)
    0.066
    """
    if not 0.0 < 2.0 * spacing < wavelength:
        raise InputError(
            f"a spacing of {spacing:g} m was given for waves {wavelength:g} m long; panels carry "
            f"no wave shorter than two of them, and six or more make it a good one: give a spacing "
            f"of {wavelength / 6:.3g} m or less"
        )
    if structured:
        sides = spacing * np.array([[1.0, 0.0], [0.0, 1.0]])
    else:
        sides = spacing * np.array([[1.0, 0.0], [-0.5, math.sqrt(0.75)]])
    k = 2.0 * math.pi / wavelength
    headings = HEADINGS if heading is None else np.array([heading])
    waves = k * np.stack([np.cos(headings), np.sin(headings)], axis=-1)
    exact = k * math.tanh(k * depth)
    errors = [math.sqrt(_symbol(wave, sides, depth, closed) / exact) - 1.0 for wave in waves]
    if structured:
        return max(errors, key=abs)
    return float(np.mean(errors))


def phase_error(
    wavelength: float,
    spacing: float,
    distance: float,
    depth: float = math.inf,
    *,
    closed: bool = False,
    structured: bool = True,
    heading: float | None = None,
) -> float:
    """Phase by which the scheme's waves are ahead after a distance, rad.

    A wave made at one frequency has its wavenumber too small by d(w)/w C/Cg (its frequency
    as a function of wavenumber is off by dw, and dw = Cg dk), hence the phase over a distance x
    is k x C/Cg d(w)/w.

    Parameters
    ----------
    distance : from where the wave is made to where it is wanted, m.
    wavelength, spacing, depth, closed, structured, heading : as `frequency_error`.

    Raises
    ------
    InputError
        As `frequency_error`.
    """
    error = frequency_error(
        wavelength, spacing, depth, closed=closed, structured=structured, heading=heading
    )
    k = 2.0 * math.pi / wavelength
    speed_ratio = 2.0 / (1.0 + float(double_depth_ratio(k * depth)))
    return k * distance * speed_ratio * error


def _symbol(wave: Array, sides: Array, depth: float, closed: bool) -> float:
    """What the scheme makes of |k| tanh(|k| h) for a wave vector (2,) on a lattice (2, 2), 1/m."""
    steps = np.arange(-HARMONICS, HARMONICS + 1)
    lattice = 2.0 * math.pi * np.linalg.inv(sides).T
    harmonics = wave + np.stack(np.meshgrid(steps, steps), axis=-1).reshape(-1, 2) @ lattice
    k = np.linalg.norm(harmonics, axis=1)
    edges = np.vstack([sides, sides.sum(axis=0)])
    # the hat on six triangles is the box spline of their three edges, so its transform is a
    # product (de Boor, Hollig & Riemenschneider, Box Splines, 1993)
    hat = np.prod(np.sinc(harmonics @ edges.T / (2.0 * math.pi)), axis=1)
    weight = hat**2 / np.sum(hat**2)
    if not closed:
        return float(np.sum(k * np.tanh(k * depth) * weight))
    bed = np.exp(-2.0 * k * depth)
    corner, diagonal = np.zeros(2), edges[2]
    triangles = np.array([[corner, sides[0], diagonal], [corner, diagonal, sides[1]]])
    flat = np.stack([_triangle_transform(harmonics, triangle) for triangle in triangles])
    rows = (flat.conj() * (0.5 * (1.0 - bed) * hat)).sum(axis=1)
    single = (flat.conj() * (0.5 * (1.0 + bed) / k)) @ flat.T
    through = np.vdot(rows, np.linalg.solve(single, rows)).real / np.sum(hat**2)
    return float(np.sum(0.5 * k * (1.0 - bed) * weight) + through)


def _triangle_transform(k: Array, corners: Array) -> npt.NDArray[np.complex128]:
    """int over an anticlockwise triangle (3, 2) of exp(-i k.x), for wave vectors k (n, 2).

    By the divergence theorem a sum over its edges, i/k^2 k.n L sinc(k.e/2) exp(-i k.middle).
    """
    total = np.zeros(len(k), dtype=np.complex128)
    for start, end in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        along = end - start
        outward = np.array([along[1], -along[0]])
        middle = 0.5 * (start + end)
        total += (k @ outward) * np.sinc(k @ along / (2 * math.pi)) * np.exp(-1j * (k @ middle))
    result: npt.NDArray[np.complex128] = 1j * total / np.sum(k**2, axis=1)
    return result
