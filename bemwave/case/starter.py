"""The case that `bemwave new` writes: small, commented, and it runs as it stands."""

from __future__ import annotations

import os
from pathlib import Path

from bemwave.errors import InputError

STARTER = """\
# A barge held in regular waves, small enough to try things on.
# Units are SI, angles degrees; z is up and z = 0 is still water.
#   bemwave plan case.toml     what to expect, before anything is solved
#   bemwave run case.toml      solve it; the results stand in case-run/

title = "A barge in regular waves"

[water]
depth = 10.0                    # metres, or "deep"

[[waves]]                       # as many of these as wanted: they add up
kind = "regular"                # or "jonswap", "pierson-moskowitz", "tma", "group", "table"
height = 0.3                    # crest to trough; for a spectrum the significant height
period = 3.5                    # for a spectrum the peak period
heading = 0.0                   # where the waves go, counter-clockwise from +x

[surface]
size = [24.0, 18.0]             # the useful water round [0, 0]; an absorber is added outside it
spacing = 1.5                   # size of the water's panels: 12 or more in the shortest wavelength
fine_spacing = 0.8              # at the waterline

[[body]]
name = "barge"
form = "box"                    # by formula; a hull of your own instead of these four lines:
length = 8.0                    #   mesh = "hull.stl"    (also .obj .ply .vtu .msh .vtp)
beam = 4.0                      #   draught = 1.0        (of the lowest point)
draught = 1.0                   # look at the file first:  bemwave mesh hull.stl
panel_size = 0.8
position = [0.0, 0.0]
heading = 0.0
# attitude = "forced"           # instead of held fast
# forced = { mode = "heave", amplitude = 0.1, period = 3.5 }

[run]
duration = 21.0                 # seconds

[[gauge]]
name = "ahead"
position = [-8.0, 0.0]

[[handoff]]                     # velocities and levels on the faces of a box, for a near-field
name = "box"                    # solver: case-run/handoff/box.nc
box = { centre = [0.0, 0.0], size = [20.0, 14.0], bottom = -6.0, top = 1.0 }
spacing = [1.0, 0.5]            # horizontal, vertical
start = 18.0                    # when the waves round the barge have settled: see the plan

[frames]                        # the water's surface as meshes for a renderer: case-run/frames/
formats = ["vtk"]               # "vtk" for a viewer; "usd", "ply" or "obj" for a renderer
fps = 10
start = 18.0
region = { size = [24.0, 18.0] }
spacing = 0.5                   # may be finer than the panels: the incident waves are exact
"""


def write_starter(folder: str | os.PathLike[str]) -> Path:
    """Write the starter case as `case.toml` in a new or empty folder.

    Parameters
    ----------
    folder : str or path
        Made if it is not there, its parents too.

    Returns
    -------
    Path
        The file written.

    Raises
    ------
    InputError
        If the folder holds anything, is a file, or cannot be made.
    """
    folder = Path(folder)
    try:
        folder.mkdir(parents=True, exist_ok=True)
        if any(folder.iterdir()):
            raise InputError(
                f"{folder}: got a folder that is not empty, expected a new or empty one"
            )
        file = folder / "case.toml"
        file.write_text(STARTER, encoding="utf-8")
    except FileExistsError:
        raise InputError(f"{folder}: got a file, expected the name of a folder to make") from None
    except OSError as error:
        raise InputError(f"{folder}: cannot be made: {error.strerror}") from None
    return file
