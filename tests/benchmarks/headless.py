"""Headless recalculation: 10,000 UF cells with 10,000 native ones, and the design workbook."""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path

from tests.benchmarks.measure import Row

CHILD = """
import sys
from time import perf_counter
from pathlib import Path
from uffuncs.cell import call
from uffuncs.headless import recalculate
import formualizer
call("UF_FLUX_DARCY", [1, 1, 5e12])
best, report = 1e9, None
for n in range(3):
    start = perf_counter()
    report = recalculate(Path(sys.argv[1]), Path(sys.argv[2]))
    best = min(best, perf_counter() - start)
    if n == 0:
        first = best
peak = 0  # of this process alone: the maximum that getrusage gives includes the parent's before exec
if sys.platform == "linux":
    peak = next(int(line.split()[1]) for line in open("/proc/self/status") if line.startswith("VmHWM")) / 1024
assert not report.errors, report.errors[:3]
print(first, best, peak, report.formulas)
"""


def rows():
    from workbooks_demo.plant_design import build

    with tempfile.TemporaryDirectory() as folder:
        large, design, out = (Path(folder) / name for name in ("large.xlsx", "design.xlsx", "out.xlsx"))
        _large(large)
        build(design)
        for label, path, bound in (("10,000 UF cells + 10,000 native cells", large, 1.0), ("plant_design.xlsx", design, 1.0)):
            done = subprocess.run([sys.executable, "-c", CHILD, str(path), str(out)], capture_output=True, text=True, check=True)
            first, best, peak, formulas = map(float, done.stdout.split())
            yield Row(f"{label} ({formulas:,.0f} formulas), first run after import", first, "s", bound)
            yield Row(f"{label}, best of three", best, "s")
            yield Row(f"{label}, peak memory of the process", peak, "MB", 200 if path is large else None)


def _large(path: Path) -> None:
    import openpyxl

    book = openpyxl.Workbook(write_only=True)
    sheet = book.create_sheet("Data")
    for r in range(1, 10_001):
        sheet.append([0.5 + r / 2500, f"=UF_FLUX_DARCY(A{r},1.002,5E12)", f"=B{r}*A{r}+1"])
    book.save(path)
