"""What all tests share."""

from __future__ import annotations

import pytest
from hypothesis import settings

from uffuncs.cell import call

# The same examples in every run: a test that fails can be run again.
settings.register_profile("project", deadline=None, derandomize=True, max_examples=60)
settings.load_profile("project")


@pytest.fixture
def why():
    """The reason that UF_WHY gives for a call."""

    def reason(name: str, *cells):
        return call("UF_WHY", [name, *cells])

    return reason
