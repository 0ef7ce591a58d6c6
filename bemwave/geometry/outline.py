"""The outer edge of the meshed water: a rectangle or a circle."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from bemwave.geometry.patterns import polygon_radius
from bemwave.geometry.surface_mesh import BoolArray, FloatArray

SIDES = ("x_min", "x_max", "y_min", "y_max")


@dataclass(frozen=True)
class Rectangle:
    """Water between x_min and x_max, y_min and y_max, absorber included; metres."""

    x_min: float
    x_max: float
    y_min: float
    y_max: float

    @property
    def area(self) -> float:
        """Area, m2."""
        return (self.x_max - self.x_min) * (self.y_max - self.y_min)

    def counts(self, spacing: float) -> tuple[int, int]:
        """Edges along x and along y nearest to the spacing."""
        return (
            max(1, round((self.x_max - self.x_min) / spacing)),
            max(1, round((self.y_max - self.y_min) / spacing)),
        )

    def rim(self, spacing: float) -> FloatArray:
        """Rim points counter-clockwise from the corner (x_min, y_min), (n, 2)."""
        nx, ny = self.counts(spacing)
        x = np.linspace(self.x_min, self.x_max, nx + 1)
        y = np.linspace(self.y_min, self.y_max, ny + 1)
        sides = [
            (x[:-1], np.full(nx, self.y_min)),
            (np.full(ny, self.x_max), y[:-1]),
            (x[:0:-1], np.full(nx, self.y_max)),
            (np.full(ny, self.x_min), y[:0:-1]),
        ]
        return np.concatenate([np.stack(side, axis=-1) for side in sides])

    def contains(self, points: FloatArray) -> BoolArray:
        """Which of the points (n, 2 or 3) lie strictly inside."""
        x, y = points[..., 0], points[..., 1]
        return np.asarray((x > self.x_min) & (x < self.x_max) & (y > self.y_min) & (y < self.y_max))

    def __str__(self) -> str:
        return (
            f"the rectangle x {self.x_min:g} to {self.x_max:g}, y {self.y_min:g} to {self.y_max:g}"
        )


@dataclass(frozen=True)
class Circle:
    """Round water, absorber included; metres."""

    x: float
    y: float
    radius: float

    @property
    def area(self) -> float:
        """Area, m2."""
        return math.pi * self.radius**2

    def rings(self, spacing: float) -> int:
        """Rings of the structured mesh of this spacing."""
        return max(2, round(self.radius / spacing))

    def rim(self, spacing: float) -> FloatArray:
        """Corners, counter-clockwise from +x, of the polygon that has the circle's area, (n, 2)."""
        sides = 6 * self.rings(spacing)
        angle = 2.0 * math.pi * np.arange(sides) / sides
        corner = polygon_radius(self.radius, sides)
        return np.stack([self.x + corner * np.cos(angle), self.y + corner * np.sin(angle)], axis=-1)

    def contains(self, points: FloatArray) -> BoolArray:
        """Which of the points (n, 2 or 3) lie strictly inside."""
        r = np.hypot(points[..., 0] - self.x, points[..., 1] - self.y)
        return np.asarray(r < self.radius)

    def __str__(self) -> str:
        return f"the circle of radius {self.radius:g} round ({self.x:g}, {self.y:g})"


Outline = Rectangle | Circle
