"""The command line as a whole: version, help, and refusals in one line. The rules are the project's own."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

from stagebook.tui import app
from stagebook.tui.commands import COMMANDS, command


def test_every_command_is_there_and_in_the_help(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as leaving:
        app.main(["--help"])
    assert leaving.value.code == 0
    said = capsys.readouterr().out
    for name in COMMANDS:
        assert f"    {name} " in said
        assert callable(command(name).run)


@pytest.mark.parametrize("name", COMMANDS)
def test_every_command_has_help_for_eighty_columns(
    name: str, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    with pytest.raises(SystemExit) as leaving:
        app.main([name, "--help"])
    assert leaving.value.code == 0
    assert max(map(len, capsys.readouterr().out.splitlines())) <= 80


@pytest.mark.parametrize("written", [["brew"], ["--nonsense"], ["schema", "too", "much"], ["schema\n"], ["--store"]])
def test_a_wrong_command_line_is_one_line(written: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as leaving:
        app.main(written)
    assert leaving.value.code == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert len(captured.err.splitlines()) == 1
    assert "--help" in captured.err


def test_the_schema_is_the_documents(capsys: pytest.CaptureFixture[str]) -> None:
    assert app.main(["schema"]) == 0
    schema = json.loads(capsys.readouterr().out)
    assert schema["type"] == "object"
    assert {"stagebook", "name", "stages", "conditions", "sequences", "requirements"} <= set(schema["properties"])


def test_a_fault_of_the_program_is_one_line_too(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv("STAGEBOOK_TRACE", raising=False)
    monkeypatch.setattr(command("schema"), "run", lambda asked: 1 // 0)
    assert app.main(["schema"]) == app.OWN_FAULT
    assert "fault of the program itself (ZeroDivisionError" in capsys.readouterr().err


def test_output_that_nobody_reads_to_the_end_is_no_fault() -> None:
    code = "import sys; from stagebook.tui.app import main; sys.exit(main(['schema']))"
    with subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.PIPE) as program:
        assert program.stdout is not None
        assert program.stderr is not None
        program.stdout.close()
        assert program.stderr.read() == b""
        assert program.wait(timeout=60) == 0


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="a device that is always full, of Linux")
def test_output_that_cannot_be_written_is_one_line() -> None:
    code = "import sys; from stagebook.tui.app import main; sys.exit(main(['schema']))"
    with open("/dev/full", "w") as full:
        done = subprocess.run([sys.executable, "-c", code], stdout=full, stderr=subprocess.PIPE, text=True, check=False)
    assert done.returncode == 2
    assert done.stderr.splitlines() == [
        "stagebook schema: the output cannot be written (No space left on device); send it elsewhere"
    ]


def test_output_in_another_encoding_is_still_json(tmp_path: Path) -> None:
    document = {"stagebook": 1, "name": "\u03a9", "sequences": {"alarm": {"ends": "1 s"}}}
    (tmp_path / "ohm.json").write_text(json.dumps(document))
    code = (
        "import sys; from stagebook.tui.app import main\n"
        "main(['import', 'ohm.json', '--store', 's']); main(['list', '--json', '--store', 's'])"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        env={**os.environ, "PYTHONIOENCODING": "ascii"},
        cwd=tmp_path,
        capture_output=True,
        text=True,
        check=True,
    )
    first, listed = done.stdout.split("\n", 1)
    assert first.startswith("? is on the shelf")
    assert json.loads(listed)["designs"][0]["name"] == "\u03a9"


def test_what_was_typed_is_not_repeated_without_end(capsys: pytest.CaptureFixture[str]) -> None:
    assert app.main(["export", "x" * 100_000 + ".json", "out.json"]) == 2
    assert len(capsys.readouterr().err) < 1000


def test_words_of_options_are_written_out(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit):
        app.main(["list", "--js"])
    assert "--js" in capsys.readouterr().err


def test_the_schema_needs_no_solver_screen_or_database() -> None:
    code = (
        "import sys; from stagebook.tui.app import main; main(['schema'])\n"
        "print([name for name in ('numba', 'textual', 'sqlmodel', 'numpy') if name in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stderr.strip() == "[]"


def test_without_a_command_a_pipe_is_refused_in_one_line(capsys: pytest.CaptureFixture[str]) -> None:
    assert app.main([]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert len(captured.err.splitlines()) == 1
    assert "need a terminal" in captured.err


def test_a_store_that_cannot_be_opened_is_told_before_the_screen_is_taken(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.setattr(sys.stdin, "isatty", lambda: True)
    monkeypatch.setattr(sys.stdout, "isatty", lambda: True)
    monkeypatch.setattr(sys.stderr, "isatty", lambda: True)
    assert app.main(["--store", str(tmp_path)]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert "is not a file" in captured.err
