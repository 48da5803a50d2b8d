"""Figures out of a curve, each with its uncertainty."""
