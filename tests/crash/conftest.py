"""One start of the program's modules for all that is killed in a test."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from .program import Nursery


@pytest.fixture
def nursery(tmp_path: Path) -> Iterator[Nursery]:
    made = Nursery(tmp_path)
    yield made
    made.close()
