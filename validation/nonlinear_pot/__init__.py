"""A pot whose field depends on the radius only: exact for any magnetisation curve."""
