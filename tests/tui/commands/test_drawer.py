"""``stagebook drawer``: the list, one part in full, a part taken from a file."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import pytest

Run = Callable[..., tuple[int, str, str]]
PART = {"kind": "npn", "class": "small npn", "data": {"gain": {"min": "110", "typical": "180", "source": "datasheet"}}}


@pytest.fixture
def part(tmp_path: Path) -> Path:
    file = tmp_path / "part.json"
    file.write_text(json.dumps(PART))
    return file


def test_a_part_of_a_file_is_in_the_drawer(stagebook: Run, part: Path) -> None:
    assert stagebook("drawer") == (0, "The drawer is empty.\n", "")
    status, out, _ = stagebook("drawer", "low-leak npn", "--take", part)
    assert status == 0
    lines = {line.split("  ")[0]: line for line in out.splitlines()}
    assert lines["gain"].split()[1:] == ["110", "180", "datasheet"]
    # What the file does not say is of the class, and says that it comes from memory.
    assert lines["c ob"].endswith("10 V, 1 MHz; memory")
    found = json.loads(stagebook("drawer", "--json")[1])["parts"]
    assert [(made["name"], made["version"], made["kind"], made["part"]) for made in found] == [
        ("low-leak npn", 1, "npn", PART)
    ]


def test_wrong_input_is_refused_in_one_line(refused: Callable[..., str], part: Path, tmp_path: Path) -> None:
    assert "needs a name" in refused("drawer", "--take", part)
    assert "no part 'x' in the drawer" in refused("drawer", "x")
    assert "cannot be read" in refused("drawer", "x", "--take", tmp_path / "nowhere.json")
    part.write_text('{"kind": "valve"}')
    assert "no part kind 'valve'" in refused("drawer", "x", "--take", part)
    part.write_text("[]")
    assert "holds no part" in refused("drawer", "x", "--take", part)
