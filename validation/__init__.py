"""Validation: outside references beside what Gapfield makes of them, one folder a reference."""
