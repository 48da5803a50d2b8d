"""Figures held against a budget."""
