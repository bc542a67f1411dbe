"""Blade geometry: measured stations, and the elements that the solver works on."""
