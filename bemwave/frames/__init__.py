"""Frames: the water surface and the bodies as meshes for a renderer."""

from bemwave.frames.bodies import drawn_mesh
from bemwave.frames.crests import Crests, SolvedShift
from bemwave.frames.sheet import Sheet, cut_sheet, grid_sheet, refuse_waterlines, solver_sheet
from bemwave.frames.surface import MovingSurface, WaterFrame
from bemwave.frames.usd_prims import Guide
from bemwave.frames.writer import DrawnBody, FrameWriter, frame_times, need_libraries, sheet_of

__all__ = [
    "Crests",
    "DrawnBody",
    "FrameWriter",
    "Guide",
    "MovingSurface",
    "Sheet",
    "SolvedShift",
    "WaterFrame",
    "cut_sheet",
    "drawn_mesh",
    "frame_times",
    "grid_sheet",
    "need_libraries",
    "refuse_waterlines",
    "sheet_of",
    "solver_sheet",
]
