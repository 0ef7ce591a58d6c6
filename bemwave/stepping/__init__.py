"""The free-surface conditions in time: steps, absorber, what drives them."""
