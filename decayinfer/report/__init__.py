"""Figures and report pages."""
