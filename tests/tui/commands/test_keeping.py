"""``backup`` and ``inspect`` as the contract of the commands has them: copies, and status 1 for what is wrong."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import pytest

from stagebook.storage import Store

Said = tuple[int, str, str]


def counted(stagebook: Callable[..., Said]) -> list[int]:
    """How many revisions each design on the shelf has."""
    return [design["revisions"] for design in json.loads(stagebook("list", "--json")[1])["designs"]]


def test_a_copy_is_a_store_that_can_be_inspected(stagebook: Callable[..., Said], tmp_path: Path) -> None:
    stagebook("demo", "--only-store")
    revisions = counted(stagebook)
    assert len(revisions) > 1
    assert stagebook("backup", "copy.sqlite3")[0] == 0
    with Store.open(tmp_path / "copy.sqlite3") as copy:
        assert [row.revisions for row in copy.designs()] == revisions
    status, out, err = stagebook("inspect", "--store", "copy.sqlite3")
    assert (status, err) == (0, "")
    assert f"designs: {len(revisions)}, revisions: {sum(revisions)}" in out
    assert "every hash" in out


def test_inspection_names_what_does_not_match(stagebook: Callable[..., Said], tmp_path: Path) -> None:
    stagebook("demo", "--only-store")
    with closing(sqlite3.connect(tmp_path / "shelf.sqlite3")) as raw:
        raw.execute("DROP TRIGGER revision_no_update")
        raw.execute("UPDATE revision SET note = replace(note, 'e', 'i') WHERE number = 3")
        raw.commit()
    status, out, err = stagebook("inspect")
    assert (status, err) == (1, "")
    assert "X 'flood' r3: the hash does not fit" in out
    assert "revision_no_update" in out
    status, out, err = stagebook("inspect", "--json")
    found = json.loads(out)
    assert (status, err, found["revisions"]) == (1, "", sum(counted(stagebook)))
    # The missing trigger, and the third revision of every design.
    assert len(found["problems"]) == 1 + len(counted(stagebook))
    assert [problem.startswith("'flood' r3") for problem in found["problems"]].count(True) == 1


def test_what_a_later_version_keeps_is_not_said_to_be_as_it_was_saved(
    stagebook: Callable[..., Said], tmp_path: Path
) -> None:
    stagebook("list")
    with closing(sqlite3.connect(tmp_path / "shelf.sqlite3")) as raw:
        raw.execute("PRAGMA user_version = 9")
    status, out, err = stagebook("inspect")
    assert status == 0
    assert "a later Stagebook" in err
    assert "The file is whole." in out
    assert "was not looked at" in out
    assert "Everything" not in out


@pytest.mark.parametrize("command", [["list"], ["inspect"], ["backup", "copy"], ["margins", "flood"], ["drawer"]])
def test_a_slip_in_the_name_of_a_store_is_no_empty_shelf(
    refused: Callable[..., str], stagebook: Callable[..., Said], tmp_path: Path, command: list[str]
) -> None:
    assert "there is no store shelv.sqlite3; name one that is there" in refused(*command, "--store", "shelv.sqlite3")
    assert list(tmp_path.iterdir()) == []
    stagebook("demo", "--only-store", "--store", "shelv.sqlite3")
    assert stagebook("list", "--store", "shelv.sqlite3")[0] == 0


def test_a_copy_goes_over_no_foreign_file(
    stagebook: Callable[..., Said], refused: Callable[..., str], tmp_path: Path
) -> None:
    (tmp_path / "letter").write_text("dear reader")
    assert "name another place" in refused("backup", "letter")
    assert (tmp_path / "letter").read_text() == "dear reader"


def test_a_damaged_store_is_rescued(
    stagebook: Callable[..., Said], refused: Callable[..., str], tmp_path: Path
) -> None:
    stagebook("demo", "--only-store")
    revisions = counted(stagebook)
    shelf = tmp_path / "shelf.sqlite3"
    content = shelf.read_bytes()
    shelf.write_bytes(b"noise" * 819 + b"!" + content[4096:])
    refused("inspect")
    status, out, err = stagebook("inspect", "--rescue", "saved.sqlite3")
    assert (status, err) == (1, "")
    held = f"designs: {len(revisions)}, revisions: {sum(revisions)}"
    assert f"saved.sqlite3 holds what could be read; {held}" in out
    assert "X The list of tables in the file was damaged" in out
    assert stagebook("inspect", "--store", "saved.sqlite3")[0] == 0
    found = json.loads(stagebook("inspect", "--rescue", "saved.sqlite3", "--json")[1])
    assert (found["designs"], found["revisions"], len(found["lost"])) == (len(revisions), sum(revisions), 1)
    assert "name another place" in refused("inspect", "--rescue", "shelf.sqlite3")
    assert "name a store" in refused("inspect", "--rescue", "other", "--store", "missing")
    shelf.write_bytes(content)
    assert stagebook("inspect", "--rescue", "saved.sqlite3")[:2][0] == 0
