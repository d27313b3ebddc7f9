"""Worksheet functions that work on cells as they are: about other functions, on units, solving, uncertainty, claims."""
