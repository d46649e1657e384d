"""Fields that lie in both discrete spaces: both bounds must be the exact value."""
