"""Coupled coils: mutual inductance in open space, leakage of windings over each other."""
