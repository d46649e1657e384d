"""Cores with straight legs beside solutions in three dimensions."""
