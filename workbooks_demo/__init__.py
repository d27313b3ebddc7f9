"""Demo workbooks, each with the script that builds it. The scenarios are invented; no real plant is meant."""
