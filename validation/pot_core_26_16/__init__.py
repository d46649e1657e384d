"""The pot core 26/16 with a gap of 0.5 mm: a whole design in open space."""
