"""Flow: the boundary-value problem under the surface, one file a route."""
