"""Bodies: their motions as fluxes, their stiffness, the loads on them."""
