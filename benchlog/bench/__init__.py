"""Reaching real instruments."""
