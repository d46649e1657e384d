"""Files that hold results: whole or not there at all."""
