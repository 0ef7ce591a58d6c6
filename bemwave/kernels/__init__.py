"""Compiled loops: panel integrals. Arrays in, arrays out; imports nothing of bemwave."""
