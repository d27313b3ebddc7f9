"""The physics, one topic a file: plain functions in SI units on floats or NumPy arrays; no cells, no units, no doors."""
