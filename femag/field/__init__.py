"""The field: both sides, their bounds, and refinement until the bounds are close."""
