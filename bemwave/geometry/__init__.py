"""Meshes: files, faults, cutting at the waterline, hull forms, the water surface."""
