"""Outputs: plates, figures and tile sets made from records, with their certificates."""
