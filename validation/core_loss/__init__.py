"""Core loss of the one-dimensional pot, B followed through a ripple in saturation."""
