"""Fixtures of the Excel tests."""

import pytest


@pytest.fixture(scope="package")
def excel(tmp_path_factory):
    """One workbench for all calls: the add-in is built and read in once."""
    from tests.excel.workbench import Workbench

    return Workbench(tmp_path_factory.mktemp("addin"))


@pytest.fixture
def fresh(tmp_path):
    """A workbench of its own, for what changes its state."""
    from tests.excel.workbench import Workbench

    return Workbench(tmp_path)
