"""Response shapes: the logarithm of gain and its derivatives, one file for each shape."""
