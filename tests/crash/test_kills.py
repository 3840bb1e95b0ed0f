"""The program killed with SIGKILL at random moments, in a terminal, while it is used; then its store is looked at.

What must hold is this project's own promise: what the screen has told is in the store, what it has not told is there
as a whole or not at all, revisions count 1, 2, 3 ..., and every hash fits. STAGEBOOK_KILLS is the number of kills (15;
.ci/run has 40, and 1,000 have been done), STAGEBOOK_KILLS_SEED another set of moments.
"""

from __future__ import annotations

import json
import os
import random
import shutil
import sqlite3
import time
from collections import Counter
from collections.abc import Callable
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import pytest

from stagebook.storage import Store, verify
from stagebook.storage.tables import SCHEMA

from .bench_model import Bench, Deed, deed, divider
from .program import Nursery, Program

KILLS = int(os.environ.get("STAGEBOOK_KILLS", "15"))
SEED = int(os.environ.get("STAGEBOOK_KILLS_SEED", "1"))
FRESH = 25
"""Kills until a new store: looking at all of one takes longer the more there is in it."""
OLD = Path(__file__).parents[1] / "storage" / "stores" / "schema-1.sqlite3"
KINDS = ("type", "step", "save", "undo", "migrate", "import", "type", "save", "back up", "step", "redo", "save")

pytestmark = pytest.mark.skipif(not Path("/proc/self/stat").exists(), reason="processes are watched as on Linux")


class Trials:
    """One store after the other, each used and killed again and again.

    ``bench`` is what it holds by our reckoning; ``answer`` is how long the program takes to answer a key, by which the
    moments of the kills are chosen so that some fall before, some amid and some after what they are to hit.
    """

    def __init__(self, home: Path, nursery: Nursery) -> None:
        self.home = home
        self.nursery = nursery
        self.told: Counter[str] = Counter()
        self.answer = 0.1
        self.path = home
        self.bench = Bench(divider("flood"))
        self.names = ["flood"]
        shutil.copyfile(OLD, home / "old.sqlite3")  # reading it may make files beside it
        self.old = _kept(home / "old.sqlite3")

    def begin(self, number: int) -> None:
        """A new store with one design."""
        self.path = self.home / f"shelf-{number}.sqlite3"
        self.bench, self.names = Bench(divider("flood")), ["flood"]
        with Store.open(self.path) as store:
            store.create("flood", self.bench.design)

    def program(self, *arguments: str | Path) -> Program:
        return Program(*arguments, home=self.home, start=self.nursery)

    def look(self, allowed: list[Bench]) -> int:
        """Looks at the store; returns which of the allowed benches it holds."""
        with Store.open(self.path) as store:
            assert verify(store) == []
            assert store.sitting("flood") is None  # the dead hinder nobody
            revisions = store.revisions("flood")
            assert [revision.number for revision in revisions] == list(range(1, len(revisions) + 1))
            found = (
                store.draft("flood").design.content,
                tuple((revision.content, revision.note.line) for revision in revisions),
            )
            assert [row.name for row in store.designs()] == self.names
        contents = [bench.content for bench in allowed]
        assert found in contents, f"{found} is none of {contents}"
        return contents.index(found)

    def on_the_bench(self, chance: random.Random, kind: str) -> None:
        """Some deeds, each awaited or not, and a kill soon after the keys of one of this kind."""
        with self.program("--store", self.path) as program:
            at = program.until("> flood")
            program.press("\r")
            # The head line and the line of the part are drawn in either order.
            at = max(program.until(*words, after=at) for words in (("draft", "not saved yet"), (" higher ",)))
            benches, pending, said = [self.bench], list[Deed](), list[str]()
            for one in range(1 + chance.randrange(3)):
                pending.append(deed(chance, benches[-1], chance.choice(("type", "step", "step", "undo", "redo")), said))
                said.append(pending[-1].says)
                benches.append(pending[-1].after)
                pressed = time.monotonic()
                program.press(pending[-1].keys)
                if one == 0 or chance.random() < 0.5:
                    at, pending = _awaited(program, at, pending), []
                if one == 0:
                    self.answer += (time.monotonic() - pressed - self.answer) / 3
            if kind == "save":
                at, pending = _awaited(program, at, pending), []
            last = deed(chance, benches[-1], kind, said)
            pending.append(last)
            benches.append(last.after)
            program.press(last.keys)
            ends = time.monotonic() + chance.uniform(0, (10 if last.saves else 1.5) * self.answer)
            answered = False
            while (left := ends - time.monotonic()) > 0:
                program.read(min(left, 0.005))
                if last.saves and not answered and program.text.find(" waiting for the worst", at) >= 0:
                    answered = True
                    program.press("i")
            program.kill()
            told = len(benches) - len(pending)
            for number, each in enumerate(pending, told + 1):
                place = program.text.find(each.says, at)
                if place >= 0:
                    at, told = place + len(each.says), number
        found = told - 1 + self.look(benches[told - 1 :])
        self.told["told"] += told == len(benches)
        self.told["done, not told"] += found >= told
        self.bench = replace(benches[found], past=(), future=())

    def on_import(self, chance: random.Random, number: int) -> None:
        name = f"unit {number}"
        unit = divider(name, chance.choice(("1k", "2k2")))
        (self.home / "unit.json").write_text(json.dumps(unit.dump()))
        with self.program("--store", self.path) as program:
            at = program.until("> flood")
            program.press("i")
            at = program.until("Import a design document", after=at)
            program.press("unit.json\r")
            _wait(program, chance.uniform(0, 5 * self.answer))
            program.kill()
            told = f"{name} is on the shelf" in program.text
        with Store.open(self.path) as store:
            there = name in [row.name for row in store.designs()]
            assert there or not told
            if there:
                assert store.draft(name).design == unit
                self.names = sorted([*self.names, name])
        self.told["told"] += told
        self.told["done, not told"] += there and not told
        self.look([self.bench])

    def on_backup(self, chance: random.Random, number: int) -> None:
        target = self.home / "copy.sqlite3"
        with self.program("backup", target, "--store", self.path) as program:
            _when(program, chance, lambda: any(self.home.glob(".copy.sqlite3-*.part")))
            told = "is copied to" in program.text
        assert target.exists() or not told
        if target.exists():
            with Store.open(target) as copy:
                assert verify(copy) == []
        self.told["told"] += told
        self.look([self.bench])
        with Store.open(self.path) as store:
            store.backup(target)
        with Store.open(target) as copy:
            assert copy.draft("flood").design.content == self.bench.design.content
        assert not list(self.home.glob(".copy.sqlite3*"))

    def on_migration(self, chance: random.Random, number: int) -> None:
        old = self.home / f"old-{number}.sqlite3"
        shutil.copyfile(OLD, old)
        with self.program("--store", old) as program:
            _when(program, chance, lambda: any(self.home.glob(f"*old-{number}.sqlite3-version-1*")))
            told = "> flood" in program.text
        with closing(sqlite3.connect(old)) as raw:
            assert raw.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
            (version,) = raw.execute("PRAGMA user_version").fetchone()
        assert version in ((SCHEMA,) if told else range(1, SCHEMA + 1))
        assert _kept(old) == self.old
        with Store.open(old) as store:
            assert verify(store) == []
        asides = list(self.home.glob(f"old-{number}.sqlite3-version-1-*"))
        assert asides
        for aside in asides:
            assert _kept(aside) == self.old
        self.told["told"] += told
        self.told["done, not told"] += version == SCHEMA and not told


def _wait(program: Program, seconds: float) -> None:
    ends = time.monotonic() + seconds
    while (left := ends - time.monotonic()) > 0:
        program.read(min(left, 0.005))


def _when(program: Program, chance: random.Random, begun: Callable[[], bool]) -> None:
    """Kills soon after something has begun, unless the program was quicker."""
    ends = time.monotonic() + 60
    while program.process.poll() is None and not begun():
        assert time.monotonic() < ends
        program.read(0.0005)
    _wait(program, chance.uniform(0, 0.06))
    if program.process.poll() is None:
        program.kill()
    program.drain()


def _awaited(program: Program, at: int, pending: list[Deed]) -> int:
    """Waits for the last: of deeds in quick succession the screen may pass over those between."""
    return program.until(pending[-1].says, after=at) if pending else at


def _kept(file: Path) -> list[list[tuple[object, ...]]]:
    with closing(sqlite3.connect(f"{file.absolute().as_uri()}?mode=ro", uri=True)) as raw:
        return [
            raw.execute(f"SELECT * FROM {table}").fetchall()
            for table in ("design", "revision", "margin", "note_entry", "draft", "edit")
        ]


def test_nothing_told_is_lost_whenever_the_program_is_killed(
    tmp_path: Path, nursery: Nursery, capsys: pytest.CaptureFixture[str]
) -> None:
    trials = Trials(tmp_path, nursery)
    done: Counter[str] = Counter()
    for number in range(KILLS):
        if number % FRESH == 0:
            trials.begin(number)
        kind = KINDS[number % len(KINDS)]
        chance = random.Random(f"{SEED} {number}")
        try:
            special = {"import": trials.on_import, "back up": trials.on_backup, "migrate": trials.on_migration}
            if kind in special:
                special[kind](chance, number)
            else:
                trials.on_the_bench(chance, kind)
        except BaseException as error:
            error.add_note(f"at kill {number} of seed {SEED}: {kind}; before it: {dict(done)}")
            raise
        done[kind] += 1
    with capsys.disabled():
        print(f"\nfigure: kills {done.total()} {dict(done)}, of these {dict(trials.told)}")
    assert done.total() == KILLS
