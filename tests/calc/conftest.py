"""Fixtures of the tests with the real LibreOffice; without one they are skipped, or fail where it must be."""

from __future__ import annotations

import os
import sys
import tempfile
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))  # tests are imported without their folder on the path

from calc_session import Session, settings, uno_bridge

from uffuncs.calc.office import Office, OfficeProblem, find_office

#: Set where these tests have to run: a missing LibreOffice is then a failure.
NEEDED = "UFFUNCS_NEED_CALC"


@pytest.fixture(scope="session")
def office() -> Office:
    """The installed LibreOffice with its Python bridge."""
    try:
        found = find_office()
        uno_bridge()
    except (OfficeProblem, ImportError) as error:
        reason = f"no LibreOffice to test with: {error}"
        if os.environ.get(NEEDED):
            pytest.fail(reason)
        pytest.skip(reason)
    return found


@pytest.fixture
def bare_python(tmp_path) -> str:
    """This Python without its installed packages, so without the library, wherever that is installed."""
    script = tmp_path / "bare_python"
    script.write_text(f'#!/bin/sh\nexec "{sys.executable}" -S "$@"\n')
    script.chmod(0o755)
    return str(script)


@pytest.fixture(scope="module")
def folder():
    """A folder for profiles; short, because a pipe's name has to fit into a socket address."""
    with tempfile.TemporaryDirectory(prefix="ufcalc", ignore_cleanup_errors=True) as name:
        yield Path(name)


@pytest.fixture(scope="module")
def calc(office, folder):
    """A running LibreOffice whose functions run in process where they can."""
    with Session(office, folder, settings(folder)) as session:
        yield session


@pytest.fixture
def sheet(calc):
    """An empty sheet of a new document."""
    document = calc.open()
    yield document.Sheets.getByIndex(0)
    document.close(True)
