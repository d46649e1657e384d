"""Air coils of rectangular section in open space: self and mutual inductance."""
