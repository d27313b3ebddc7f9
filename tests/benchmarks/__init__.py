"""Benchmarks: they print measured times and ratios beside what is to be reached; they are no tests."""
