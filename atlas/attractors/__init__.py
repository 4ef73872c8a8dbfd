"""Attractors: which orbits reach the same one, in basin charts, planes and densities."""
