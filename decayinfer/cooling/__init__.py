"""Crust temperatures: stars, thermal evolution, and scenarios in one closed form with coefficients as data."""
