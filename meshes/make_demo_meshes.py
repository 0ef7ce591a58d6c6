"""Make the demonstration's ready meshes, so that running it needs no mesher.

    python meshes/make_demo_meshes.py

Writes tender-wetted.vtu, offshore-platform.vtu and platform.vtu, a smaller one (hulls cut at still
water and meshed to their panel size, in their own axes, normals out of the hull), and water.vtu, a
sheet of panels round the tender and the smaller platform. Needs gmsh. Change the panel sizes here
and in the case files together.
"""

import math
from pathlib import Path

from bemwave.geometry.columns import columns
from bemwave.geometry.files import read_mesh, write_mesh
from bemwave.geometry.hull import place_hull, prepare_hull
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.water_surface import water_surface

FOLDER = Path(__file__).parent

SIZE = (48.0, 38.0)  # useful water, m, round the origin
ABSORBER = 50.0  # width outside it, m
SPACING, FINE_SPACING = 3.4, 1.4  # of the water, far away and at waterlines, m

TENDER_DRAUGHT, TENDER_PANEL = 1.9, 1.2
TENDER_POSITION, TENDER_HEADING = (12.0, 0.0), 90.0  # m, degrees

PLATFORM = {"spacing": 16.0, "column_radius": 2.0, "pontoon": 2.0, "draught": 6.0}
PLATFORM_PANEL = 2.2
PLATFORM_POSITION, PLATFORM_HEADING = (-12.5, 0.0), 0.0

OFFSHORE = {"spacing": 26.0, "column_radius": 3.5, "pontoon": 4.0, "draught": 9.0}
OFFSHORE_PANEL = 2.1


def main():
    """Make and write all meshes."""
    tender = prepare_hull(
        read_mesh(FOLDER / "tender.stl"),
        "tender",
        draught=TENDER_DRAUGHT,
        panel_size=TENDER_PANEL,
    )
    platform = place_hull("platform", columns(**PLATFORM, panel_size=PLATFORM_PANEL))
    offshore = place_hull("offshore", columns(**OFFSHORE, panel_size=OFFSHORE_PANEL))
    write_mesh(offshore.mesh.flipped(), FOLDER / "offshore-platform.vtu")
    write_mesh(tender.mesh.flipped(), FOLDER / "tender-wetted.vtu")
    write_mesh(platform.mesh.flipped(), FOLDER / "platform.vtu")
    hulls = [
        tender.moved(TENDER_POSITION, math.radians(TENDER_HEADING)),
        platform.moved(PLATFORM_POSITION, math.radians(PLATFORM_HEADING)),
    ]
    x, y = (0.5 * side + ABSORBER for side in SIZE)
    water = water_surface(Rectangle(-x, x, -y, y), SPACING, hulls, FINE_SPACING)
    write_mesh(water, FOLDER / "water.vtu")
    for name, mesh in (("tender", tender.mesh), ("platform", platform.mesh), ("water", water)):
        print(f"{name}: {len(mesh.triangles)} triangles")


if __name__ == "__main__":
    main()
