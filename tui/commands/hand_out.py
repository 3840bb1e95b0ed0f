"""``stagebook export``: write a design document to a file."""

from __future__ import annotations

import os
import sys
from argparse import ArgumentParser, Namespace
from pathlib import Path

from ..out_file import file_name, write_file
from ..shown import counted, json_text, visible
from .what import find, subject_arguments


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT, which of its states, and FILE."""
    subject_arguments(parser)
    parser.add_argument("file", metavar="FILE", help="where to write the document: a file, or a folder")


def run(asked: Namespace) -> int:
    """Write the document with its texts as typed; what no screen shows is escaped, as JSON allows."""
    subject = find(asked)
    folder = asked.file and os.path.isdir(asked.file)  # False too for what may not be looked at
    file = str(Path(asked.file) / file_name(subject.title, ".json")) if folder else asked.file
    write_file(file, f"{json_text(subject.design.dump())}\n".encode(), subject.file)
    if folder:
        print(f"{visible(subject.title)} is written to {visible(file)}")
    if subject.edits:
        words = f"{visible(subject.title)} is written, without {counted(subject.edits, 'edit')} of the draft"
        print(f"stagebook export: {words}; --draft writes the draft", file=sys.stderr)
    return 0
