"""Look at a hull file, put it in the water, cut it there, and write what a run would take.

    python examples/hull_file.py

The same from the command line:
    bemwave mesh meshes/tender.stl --draught 1.9 --cut --out tender-wetted.vtp
"""

import sys
from pathlib import Path

from bemwave.geometry.files import write_mesh
from bemwave.geometry.inspection import inspect_hull

HULL = Path(__file__).parent.parent / "meshes" / "tender.stl"
DENSITY = 1025.0  # sea water, kg/m3


def main(out: Path) -> dict[float, float]:
    """Displacement [t] over draught [m], and the hull cut at 1.9 m in a file."""
    found = inspect_hull(HULL, draught=1.9, cut=True)
    for label, value, unit in found.rows():
        print(f"{label:<20} {value} {unit}")
    for remark in (*found.notes, *found.faults):
        print(remark)
    write_mesh(found.mesh, out)

    displacement = {}
    for draught in (1.5, 1.7, 1.9, 2.1):
        data = inspect_hull(HULL, draught=draught).hydrostatics
        assert data is not None  # some of her is under water
        displacement[draught] = 1e-3 * DENSITY * data.volume
        immersion = 1e-5 * DENSITY * data.waterplane_area
        print(f"draught {draught} m: {displacement[draught]:.1f} t, {immersion:.2f} t each cm")
    return displacement


if __name__ == "__main__":
    main(Path(sys.argv[1] if len(sys.argv) > 1 else "tender-wetted.vtp"))
