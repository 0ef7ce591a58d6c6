"""Run by mitsuba's own Python: load a surface of PLY files, measure it, and draw it.

    python render_ply.py OUT.npz PICTURE.npy WATER.ply ... BODY.ply
"""

import sys

import mitsuba
import numpy as np


def main(out, picture, *files):
    mitsuba.set_variant("scalar_rgb")
    measured = {}
    for number, file in enumerate(files):
        mesh = mitsuba.load_dict({"type": "ply", "filename": file})
        parameters = mitsuba.traverse(mesh)
        for name in ("vertex_positions", "vertex_normals", "faces"):
            measured[f"{name}_{number}"] = np.array(parameters[name])
    np.savez(out, **measured)
    eye = mitsuba.ScalarTransform4f().look_at(origin=[-14, -10, 5], target=[0, 0, 0], up=[0, 0, 1])
    sky = {"type": "constant", "radiance": {"type": "rgb", "value": [0.5, 0.6, 0.8]}}
    sun = {"type": "directional", "direction": [1, 0.4, -0.5],
           "irradiance": {"type": "rgb", "value": [1.5, 1.4, 1.2]}}  # fmt: skip
    water = {"type": "plastic", "diffuse_reflectance": {"type": "rgb", "value": [0.0, 0.06, 0.08]}}
    paint = {"type": "twosided", "inner": {"type": "diffuse",
             "reflectance": {"type": "rgb", "value": [0.7, 0.25, 0.05]}}}  # fmt: skip
    scene = mitsuba.load_dict(
        {
            "type": "scene",
            "integrator": {"type": "path", "max_depth": 4},
            "sensor": {
                "type": "perspective", "fov": 50, "to_world": eye,
                "film": {"type": "hdrfilm", "width": 320, "height": 180},
                "sampler": {"type": "independent", "sample_count": 16},
            },
            "sky": sky,
            "sun": sun,
            "water": {"type": "ply", "filename": files[0], "bsdf": water},
            "body": {"type": "ply", "filename": files[-1], "bsdf": paint},
        }
    )  # fmt: skip
    np.save(picture, np.array(mitsuba.render(scene)))


if __name__ == "__main__":
    main(*sys.argv[1:])
