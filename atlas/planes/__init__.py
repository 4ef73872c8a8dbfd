"""Parameter planes: what becomes of the orbit of every pixel."""
