"""Panel integrals: numba alone, arrays in, arrays out; imports nothing of bemwave."""

import os

# threads that have nothing to do sleep: spinning, they take the cores that others need
os.environ.setdefault("OMP_WAIT_POLICY", "passive")
