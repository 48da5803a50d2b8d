"""CSV text made elsewhere becomes a curve."""
