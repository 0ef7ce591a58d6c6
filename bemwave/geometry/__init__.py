"""Meshes: files, faults, cutting at the waterline, hull forms, the water surface.

From a hull file to the boundary that the flow is solved on:

    files           read_mesh, write_mesh
    hull_file       weld, leave out, scale, turn, cut         (faults, cut, pose, topology)
    hull            prepare_hull -> Hull                      (remesh, mesher, hydrostatics)
    forms, columns  wetted hulls by formula
    bodies          hull_from: a [[body]] of the case -> Hull
    outline         Rectangle, Circle
    water_surface   water_surface, fitted_water               (layout, patterns, mesher)
    boundary        boundary_mesh: water, hulls and walls in one SurfaceMesh
    inside          which points lie in a hull
    inspection      inspect_hull: what `bemwave mesh` prints

gmsh runs in a process of its own (mesher, gmsh_jobs); nothing else here touches it.
"""
