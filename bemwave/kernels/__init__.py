"""Panel integrals: numba alone, arrays in, arrays out; imports nothing of bemwave."""
