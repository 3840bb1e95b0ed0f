"""Hostile documents: every one is taken or refused in one line, within bounds of time and memory.

150 documents by default; STAGEBOOK_FUZZ=20000 tries so many, and writes how far they came. The hypothesis test can be
driven by a coverage-guided fuzzer too (DEVELOPERS.md). The rules are the project's own.
"""

from __future__ import annotations

import os
import time
import tracemalloc
import unicodedata
from collections import Counter
from collections.abc import Iterator
from zlib import crc32

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings

from stagebook.engine.circuit.circuit import build
from stagebook.engine.design.differences import differences
from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError, DesignError, EngineError
from stagebook.engine.studies.evaluate import asks_of
from stagebook.engine.studies.waves import waves

from .fuzzed import GOOD, sources

DOCUMENTS = int(os.environ.get("STAGEBOOK_FUZZ", "150"))
LONGEST = 10.0
"""Seconds for one document, on a busy machine and without its run."""
MOST_MEMORY = 300_000_000
"""Bytes that Python and NumPy may take for one document without its run."""
RUN_ONE_IN = int(os.environ.get("STAGEBOOK_FUZZ_RUNS", "1"))
"""How many of the circuits that are built are run: every one, or one in so many."""
MOST_UNKNOWNS = 80
"""Larger circuits are built and not run here."""

WHOLE = tuple(map(Design.load, GOOD))
came: Counter[str] = Counter()


@pytest.fixture(scope="module", autouse=True)
def told() -> Iterator[None]:
    yield
    if "STAGEBOOK_FUZZ" in os.environ:
        print("\nfuzzed documents:", ", ".join(f"{count} {how}" for how, count in sorted(came.items())))


def one_line(refusal: EngineError) -> None:
    """A refused document is told in plain characters; what was taken may hold hidden ones, which screens write out."""
    line = str(refusal)
    assert line.isprintable() or not isinstance(refusal, DesignError)
    assert not any(unicodedata.category(character) in ("Cc", "Zl", "Zp") for character in line)
    assert 10 < len(line) < 2000


def far(source: bytes) -> str:
    """How far a document comes. Anything but a refusal in one line is a failure of the test."""
    try:
        design = Design.load(source)
    except DesignError as refusal:
        one_line(refusal)
        return "are no documents"
    assert Design.load(design.canonical()).content == design.content
    assert Design.load(design.dump()) == design
    for change in differences(WHOLE[len(source) % len(WHOLE)], design):
        assert change.what
    try:
        circuit = build(design)
        asks_of(circuit)
    except CircuitError as refusal:
        one_line(refusal)
        return "are no circuits"
    except DesignError as refusal:
        one_line(refusal)
        return "have data that cannot be read"
    if circuit.topology.size[1] > MOST_UNKNOWNS or crc32(source) % RUN_ONE_IN:
        return "were built"
    return run(design)


def run(design: Design) -> str:
    try:
        found = waves(design)
    except EngineError as refusal:
        one_line(refusal)
        return "were not solved"
    assert np.all(np.isfinite(found.values))
    return "were run"


@settings(
    max_examples=DOCUMENTS, deadline=None, suppress_health_check=list(HealthCheck), print_blob=True, database=None
)
@given(sources())
def test_a_hostile_document_is_taken_or_refused_in_one_line(source: bytes) -> None:
    began = time.perf_counter()
    how = far(source)
    came[how] += 1
    if how not in ("were run", "were not solved"):
        assert time.perf_counter() - began < LONGEST


@settings(max_examples=20, deadline=None, suppress_health_check=list(HealthCheck), database=None)
@given(sources())
def test_a_hostile_document_takes_no_more_memory_than_its_size_allows(source: bytes) -> None:
    tracemalloc.start()
    try:
        Design.load(source)
    except DesignError:
        pass
    finally:
        _, most = tracemalloc.get_traced_memory()
        tracemalloc.stop()
    assert most < MOST_MEMORY
