"""Orbits: the compiled map, the kernels, whole histograms, the Dataset."""
