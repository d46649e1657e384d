"""Fringing between two round posts of ideal iron: the benchmark of this tool."""
