"""Tables of commands: the project's own contract (eighty columns, or what the terminal has). No outside source."""

from __future__ import annotations

import sys

import pytest

from stagebook.tui.commands.printing import print_table

HEADS = ("design", "saved", "check")
ROWS = [("a-design-with-a-rather-long-name-as-some-have", "2026-12-01 21:30", "latch_reset:latch-two:Q4")]


def printed(capsys: pytest.CaptureFixture[str]) -> list[str]:
    print_table(HEADS, ROWS)
    return capsys.readouterr().out.splitlines()


def test_an_id_goes_on_below_behind_a_colon_only(capsys: pytest.CaptureFixture[str]) -> None:
    _, first, *more = printed(capsys)
    assert [first.split()[-1], *(line.strip() for line in more)] == ["latch_reset:", "latch-two:Q4"]


def test_a_table_takes_the_width_of_the_terminal(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sys.stdout, "isatty", lambda: True)
    monkeypatch.setenv("COLUMNS", "120")
    assert printed(capsys)[1].endswith(ROWS[0][-1])
    monkeypatch.setenv("COLUMNS", "80")
    assert len(printed(capsys)) == 3


def test_what_is_longer_than_any_name_is_broken(capsys: pytest.CaptureFixture[str]) -> None:
    print_table(("part", "note"), [("R1", "x" * 300)])
    assert max(map(len, capsys.readouterr().out.splitlines())) <= 80
