"""A sphere in a sin(theta) winding: uniform inside, exact for any magnetisation curve."""
