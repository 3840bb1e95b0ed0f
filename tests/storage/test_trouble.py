"""A full disk, a limit on files, a clock that goes back: a plain sentence with the remedy, and nothing lost.

The full disk is a file system in memory of 400 kB, mounted for the test (tmpfs; root only). Where mounting is not
permitted the same steps run against RLIMIT_FSIZE (POSIX, setrlimit), of which SQLite says so less clearly.
"""

from __future__ import annotations

import json
import os
import sqlite3
import subprocess
import tempfile
from collections.abc import Callable, Iterator
from contextlib import closing
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from stagebook.storage import Note, Store, StoreBusy, StoreUnreadable, connection, inspect, verify

Plain = Callable[[BaseException], str]
posix = pytest.mark.skipif(os.name != "posix", reason="mount points and limits are those of POSIX systems")

FILL = """
import resource
limit = None if sys.argv[4] == "disk" else 300_000
store = Store.open(path)
store.create("flood", design())
if limit:
    import signal
    signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit))
acknowledged = 0
try:
    for number in range(1, 100_000):
        store.edit("flood", "a label " * 200, design(f"{number}k"))
        acknowledged = number
except StorageError as refusal:
    say(type(refusal).__name__, refusal)
say(acknowledged)
try:
    store.save("flood", Note("why " * 2000), sheet_of(store.draft("flood").design))
    say("saved")
except StorageError as refusal:
    say(type(refusal).__name__, refusal)
try:
    store.backup(path.parent / "copy")
    say("copied")
except StorageError as refusal:
    say(type(refusal).__name__, refusal)
say(store.draft("flood").design.part("R8").value, verify(store))
store.close()
"""


@pytest.fixture
def full_disk(tmp_path: Path) -> Iterator[tuple[Path, str]]:
    """A folder on a disk of 400 kB, and "disk"; any folder, and "limit", where mounting is not permitted."""
    folder = tmp_path / "small"
    folder.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", "size=400k,mode=0700", "stagebook-test", str(folder)]
    try:
        mounted = subprocess.run(mount, capture_output=True, check=False).returncode == 0
    except OSError:
        mounted = False
    yield folder, "disk" if mounted else "limit"
    if mounted:
        subprocess.run(["umount", str(folder)], check=True)


@posix
@pytest.mark.parametrize("how", ["disk", "limit"])
def test_a_full_disk_loses_nothing_that_was_acknowledged(
    full_disk: tuple[Path, str], child: Callable, next_line: Callable, design: Callable, how: str
) -> None:
    folder, found = full_disk
    if how == "limit" or found == "limit":
        folder, how = folder.parent, "limit"
    path = folder / "s.sqlite3"
    process = child(FILL.replace("sys.argv[4]", repr(how)), path)
    refusal, acknowledged = next_line(process), int(next_line(process))
    if how == "disk":
        assert refusal.startswith(f"StoreFull The disk of {path} is full; the last change was not saved. Make room")
    else:
        assert refusal.startswith(f"StoreUnreadable {path} cannot be read or written")
        assert "see whether the disk is full" in refusal
    assert acknowledged > 5
    assert next_line(process).startswith(("StoreFull", "StoreUnreadable"))
    copied = next_line(process)
    assert "cannot be written" in copied or (copied == "copied" and how == "limit")
    assert next_line(process) == f"{acknowledged}k []"
    assert process.wait(30) == 0
    assert not list(folder.glob(".copy*"))
    if how == "disk":  # room is made: it goes on
        subprocess.run(["mount", "-o", "remount,size=4m", str(folder)], check=True)
    with Store.open(path) as store:
        assert store.draft("flood").design == design(f"{acknowledged}k")
        assert verify(store) == []
        store.edit("flood", "R8", design("1M"))
        assert store.undo("flood").design == design(f"{acknowledged}k")


@posix
def test_a_disk_that_is_full_from_the_start_is_told(
    full_disk: tuple[Path, str], child: Callable, next_line: Callable
) -> None:
    folder, how = full_disk
    path = folder / "s.sqlite3"
    if how == "disk":
        (folder / "film").write_bytes(b"x" * 390_000)
    code = """
import resource, signal
if HOW == "limit":
    signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    resource.setrlimit(resource.RLIMIT_FSIZE, (8192, 8192))
try:
    Store.open(path)
    say("open")
except StorageError as refusal:
    say(type(refusal).__name__, refusal)
"""
    line = next_line(child(code.replace("HOW", repr(how)), path))
    assert line.startswith(("StoreFull", "StoreUnreadable"))
    assert "full" in line
    if how == "disk":
        (folder / "film").unlink()
        with Store.open(path) as store:
            assert store.designs() == []


HOME = """
import contextlib, io, tempfile
from stagebook.tui.app import main
for name in ("STAGEBOOK_STORE", "XDG_DATA_HOME", "XDG_CACHE_HOME"):
    os.environ.pop(name, None)
os.environ["HOME"] = str(path)
with contextlib.redirect_stdout(io.StringIO()):  # all that is imported later is imported now
    main(["list", "--store", tempfile.mkdtemp() + "/s"])
if os.getuid() == 0:
    os.setgroups([]), os.setgid(65534), os.setuid(65534)
sys.stderr = sys.stdout
say(main(["list"]))
"""


@posix
def test_a_home_that_cannot_be_written_is_told(child: Callable, next_line: Callable) -> None:
    with tempfile.TemporaryDirectory() as name:
        home = Path(name)
        home.chmod(0o555)
        process = child(HOME, home)
        line = next_line(process)
        home.chmod(0o755)
        assert line.startswith("stagebook list: ")
        assert f"{home}/.local/share/stagebook/stagebook.sqlite3 cannot be opened (Permission denied)" in line
        assert "--store" in line
        assert next_line(process) == "2"
        assert list(home.iterdir()) == []


CLOSED = """
import contextlib, io
from stagebook.tui.app import main
os.chdir(path.parent)
commands = json.loads(COMMANDS)
with contextlib.redirect_stdout(io.StringIO()), contextlib.redirect_stderr(io.StringIO()):
    main(["import", "flood.json", "--store", str(path)])
    for command in commands:  # all that is imported later is imported now
        main(command)
(path.parent / "closed").chmod(0o700)
if os.getuid() == 0:
    os.setgroups([]), os.setgid(65534), os.setuid(65534)
sys.stderr = sys.stdout
for command in commands:
    say(main(command))
"""


@pytest.mark.skipif(os.name != "posix" or os.getuid() != 0, reason="a folder that is closed to its user is root's here")
def test_a_folder_that_may_not_be_looked_into_is_one_line(
    child: Callable, next_line: Callable, design: Callable
) -> None:
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        folder.chmod(0o777)
        (folder / "closed").mkdir()
        (folder / "flood.json").write_text(json.dumps(design().dump()))
        commands = [
            ["list", "--store", "closed/x"],
            ["import", "flood.json", "--store", "closed/x"],
            ["inspect", "--store", "closed/x", "--rescue", "r"],
            ["export", "flood.json", "closed/x.json"],
            ["export", "closed/x.json", "x.json"],
            ["waves", "flood.json", "--csv", "closed/x.csv"],
        ]
        process = child(f"COMMANDS = {json.dumps(json.dumps(commands))}\n{CLOSED}", folder / "s.sqlite3")
        for command in commands:
            line = next_line(process)
            assert line.startswith(f"stagebook {command[0]}: "), line
            assert "(Permission denied)" in line, line
            assert next_line(process) == "2"


def test_a_store_that_another_program_keeps_is_told_at_opening(
    path: Path, design: Callable, plain: Plain, monkeypatch: pytest.MonkeyPatch
) -> None:
    with Store.open(path) as store:
        store.create("flood", design())
    monkeypatch.setattr(connection, "PATIENCE", 0.05)
    with closing(sqlite3.connect(path, isolation_level=None)) as other:
        other.execute("PRAGMA locking_mode = EXCLUSIVE")
        other.execute("BEGIN IMMEDIATE")
        other.execute("UPDATE draft SET base_id = NULL")
        with pytest.raises(StoreBusy) as refusal:
            Store.open(path)
        assert "Another program keeps" in plain(refusal.value)
        assert "Try again" in str(refusal.value)
    with Store.open(path) as store:
        assert store.draft("flood").design == design()


def test_a_clock_that_goes_back_loses_nothing_and_is_told(path: Path, design: Callable, sheet: Callable) -> None:
    """Revisions follow each other by number and hash, not by the clock; what it said is kept as it said it."""
    now = datetime(2026, 12, 1, 9, 0, tzinfo=UTC)
    with Store.open(path, clock=lambda: now) as store:
        store.create("flood", design())
        for value, back in (("22k", 0), ("33k", 400), ("47k", 399)):
            now = datetime(2026, 12, 1, 9, 0, tzinfo=UTC) - timedelta(days=back)
            store.edit("flood", value, design(value))
            store.save("flood", Note(value), sheet(design(value), driver=0.2))
            store.add_note("flood", 1, "result", f"seen at {value}")
        assert [revision.number for revision in store.revisions("flood")] == [1, 2, 3]
        assert [revision.parent for revision in store.revisions("flood")] == [None, 1, 2]
        assert store.designs()[0].saved == store.revision("flood").saved == "2025-10-28T09:00:00+00:00"
        assert store.revision("flood", 1).note.result == "seen at 22k\nseen at 33k\nseen at 47k"
        assert store.undo("flood").design == design("33k")
        assert verify(store) == []
        (advice,) = inspect(store).advice
    assert advice.startswith("'flood' r2 was saved on 2025-10-27 by the clock, before r1 on 2026-12-01: the clock")
    assert "set it" in advice


@pytest.mark.parametrize("now", [datetime(1, 1, 1, tzinfo=UTC), datetime(9999, 12, 31, 23, 59, tzinfo=UTC)])
def test_a_clock_that_is_far_off_keeps_nobody_from_saving(
    path: Path, design: Callable, sheet: Callable, now: datetime
) -> None:
    with Store.open(path, clock=lambda: now) as store:
        store.create("flood", design())
        store.save("flood", Note("x"), sheet(design(), driver=0.2))
        assert verify(store) == []
        assert store.revision("flood").saved == now.isoformat()


def test_what_is_damaged_is_told_with_the_way_to_rescue_it(path: Path, design: Callable, plain: Plain) -> None:
    with Store.open(path) as store:
        store.create("flood", design())
    content = path.read_bytes()
    path.write_bytes(content[: len(content) // 2])
    with pytest.raises(StoreUnreadable) as refusal, Store.open(path) as store:
        store.draft("flood")
    assert "stagebook inspect --rescue FILE" in plain(refusal.value)
