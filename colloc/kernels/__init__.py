"""Loops that are compiled where numba is installed, and the switch that says whether they are."""
