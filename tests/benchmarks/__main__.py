"""`python -m tests.benchmarks [word …]` runs all benchmarks, or those whose module has a word in its name."""

from __future__ import annotations

import platform
import sys
from importlib import import_module
from pathlib import Path

from tests.benchmarks.measure import Row


def main() -> None:
    words = sys.argv[1:]
    names = sorted(p.stem for p in Path(__file__).parent.glob("*.py") if p.stem not in ("__init__", "__main__", "measure"))
    print(f"Python {platform.python_version()}, {platform.machine()}; the best of several runs; other load on the machine adds to it")
    missed = 0
    for name in names:
        if words and not any(word in name for word in words):
            continue
        print(f"\n{name}")
        for row in import_module(f"tests.benchmarks.{name}").rows():
            row = row if isinstance(row, Row) else Row(*row)
            missed += not row.reached
            print(f"  {row.name:<72} {row.measured:>10.3g} {row.unit:<8} {row.target}", flush=True)
    print(f"\n{missed} not reached")


if __name__ == "__main__":
    main()
