"""Draw a frame of the tender's shot with bpy, in a Python of its own (pip install bpy==4.2.0).

python render_tender_shot.py RUN/frames/surface.usdc PICTURE.png FRAME
"""

import math
import sys

import bpy
import mathutils

EYE, TARGET = (-16.0, -34.0, 5.5), (3.0, 0.0, 1.0)
COLOURS = {"water": (0.008, 0.035, 0.05), "tender": (0.75, 0.2, 0.04), "platform": (0.5, 0.45, 0.3)}


def main(file, picture, frame):
    """Import the file, light it, look at it, draw it."""
    bpy.ops.wm.read_factory_settings(use_empty=True)
    bpy.ops.wm.usd_import(filepath=file)
    scene = bpy.context.scene
    for thing in bpy.data.objects:
        if thing.type == "MESH":
            thing.data.materials.clear()
            thing.data.materials.append(material(thing.name))
        thing.hide_render = thing.type in ("CURVE", "CURVES")
    scene.world = bpy.data.worlds.new("sky")
    scene.world.use_nodes = True
    tree = scene.world.node_tree
    sky = tree.nodes.new("ShaderNodeTexSky")
    sky.sun_elevation, sky.sun_rotation = math.radians(24.0), math.radians(-60.0)
    sky.sun_disc = False
    tree.links.new(sky.outputs[0], tree.nodes["Background"].inputs[0])
    tree.nodes["Background"].inputs[1].default_value = 0.11
    sun = bpy.data.objects.new("sun", bpy.data.lights.new("sun", "SUN"))
    sun.data.energy, sun.data.angle = 2.5, math.radians(1.0)
    sun.rotation_euler = (math.radians(62.0), 0.0, math.radians(-60.0))
    eye = bpy.data.objects.new("eye", bpy.data.cameras.new("eye"))
    eye.location, eye.data.lens = EYE, 34.0
    toward = mathutils.Vector(TARGET) - mathutils.Vector(EYE)
    eye.rotation_euler = toward.to_track_quat("-Z", "Y").to_euler()
    for thing in (sun, eye):
        scene.collection.objects.link(thing)
    scene.camera, scene.render.engine = eye, "CYCLES"
    scene.cycles.device, scene.cycles.samples = "CPU", 96
    scene.render.resolution_x, scene.render.resolution_y = 960, 480
    scene.render.filepath = picture
    scene.frame_set(int(frame))
    bpy.ops.render.render(write_still=True)


def material(name):
    """Water that mirrors, hulls that do not."""
    made = bpy.data.materials.new(name)
    made.use_nodes = True
    surface = made.node_tree.nodes["Principled BSDF"].inputs
    surface["Base Color"].default_value = (*COLOURS[name], 1.0)
    surface["Roughness"].default_value = 0.06 if name == "water" else 0.5
    surface["IOR"].default_value = 1.33
    return made


if __name__ == "__main__":
    main(*sys.argv[1:])
