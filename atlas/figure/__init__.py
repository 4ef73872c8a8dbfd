"""Figures: ticks, layout and the files of plates."""
