"""Fixtures of the tests of recalculation."""

import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))  # tests are imported without their folder on the path

from headless_books import Bench


@pytest.fixture
def bench(tmp_path):
    return Bench(tmp_path)
