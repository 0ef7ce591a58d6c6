"""Frames: the water surface and the bodies as meshes for a renderer."""

from bemwave.frames.surface import MovingSurface, Sheet, WaterFrame, grid_sheet, solver_sheet
from bemwave.frames.writer import DrawnBody, FrameWriter, frame_times, refuse_formats, sheet_of

__all__ = [
    "DrawnBody",
    "FrameWriter",
    "MovingSurface",
    "Sheet",
    "WaterFrame",
    "frame_times",
    "grid_sheet",
    "refuse_formats",
    "sheet_of",
    "solver_sheet",
]
