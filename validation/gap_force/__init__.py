"""Pull between round posts and between coils, and what a gap's length does to the inductance."""
