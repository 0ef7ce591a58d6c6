"""The boundary-value problem of the water: flow maps, and samplers of what they solve."""
