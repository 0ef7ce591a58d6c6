"""Run by bpy's own Python: import a surface.usdc, measure it at frames, and draw it.

    python render_usd.py FILE OUT.npz FRAMES PICTURES

FRAMES: numbers with commas. PICTURES: a JSON list of {path, frame, eye, target}.
The importer and the CPU renderer only.
"""

import json
import math
import sys

import bpy
import mathutils
import numpy as np


def main(file, out, frames, pictures):
    bpy.ops.wm.read_factory_settings(use_empty=True)
    bpy.ops.wm.usd_import(filepath=file)
    scene = bpy.context.scene
    measured = {"fps": scene.render.fps, "span": [scene.frame_start, scene.frame_end]}
    for frame in map(int, frames.split(",")):
        scene.frame_set(frame)
        graph = bpy.context.evaluated_depsgraph_get()
        for thing in (o for o in bpy.data.objects if o.type == "MESH"):
            shown = thing.evaluated_get(graph)
            points = np.empty((len(shown.data.vertices), 3), dtype=np.float32)
            shown.data.vertices.foreach_get("co", points.ravel())
            measured[f"{thing.name}_{frame}"] = points
            measured[f"{thing.name}_{frame}_matrix"] = np.array(shown.matrix_world)
    np.savez(out, **measured)
    dress(scene)
    for picture in json.loads(pictures):
        scene.frame_set(picture["frame"])
        look(scene, picture["eye"], picture["target"])
        scene.render.filepath = picture["path"]
        bpy.ops.render.render(write_still=True)


def dress(scene):
    """Flat colours and light: water blue-green, hulls orange, what lies under the water magenta."""
    for thing in list(bpy.data.objects):
        if thing.type == "MESH":
            thing.data.materials.clear()
            colour = (0.0, 0.25, 0.3) if thing.name == "water" else (0.8, 0.3, 0.05)
            thing.data.materials.append(shade(thing.name, colour))
        elif thing.type in ("CURVE", "CURVES"):
            thing.hide_render = True
    world = bpy.data.worlds.new("world")
    world.use_nodes = True
    back = world.node_tree.nodes["Background"]
    back.inputs[0].default_value = (0.9, 0.0, 0.9, 1.0)  # seen through any gap in the water
    scene.world = world
    scene.render.engine = "CYCLES"
    scene.cycles.device = "CPU"
    scene.cycles.samples = 4
    scene.render.resolution_x, scene.render.resolution_y = 480, 270
    scene.view_settings.view_transform = "Raw"


def shade(name, colour):
    """A colour that needs no light, darker where it faces away."""
    material = bpy.data.materials.new(name)
    material.use_nodes = True
    tree = material.node_tree
    tree.nodes.clear()
    glow, end = tree.nodes.new("ShaderNodeEmission"), tree.nodes.new("ShaderNodeOutputMaterial")
    facing, mix = tree.nodes.new("ShaderNodeLayerWeight"), tree.nodes.new("ShaderNodeMixRGB")
    mix.inputs[1].default_value = (*colour, 1.0)
    mix.inputs[2].default_value = (*(0.3 * c for c in colour), 1.0)
    tree.links.new(facing.outputs["Facing"], mix.inputs[0])
    tree.links.new(mix.outputs[0], glow.inputs[0])
    tree.links.new(glow.outputs[0], end.inputs[0])
    return material


def look(scene, eye, target):
    if scene.camera is None:
        scene.camera = bpy.data.objects.new("eye", bpy.data.cameras.new("eye"))
        scene.collection.objects.link(scene.camera)
        scene.camera.data.angle = math.radians(45.0)
    scene.camera.location = eye
    toward = mathutils.Vector(target) - mathutils.Vector(eye)
    scene.camera.rotation_euler = toward.to_track_quat("-Z", "Y").to_euler()


if __name__ == "__main__":
    main(*sys.argv[1:])
