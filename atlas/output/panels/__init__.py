"""Panels of plates, one kind of view a module."""
