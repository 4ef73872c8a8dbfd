"""The user's own points, measured or simulated, counted into the cells of a view as orbits are."""
