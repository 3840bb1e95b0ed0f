"""``stagebook export``: write a design document to a file."""

from __future__ import annotations

import json
from argparse import ArgumentParser, Namespace

from .out_file import write_file
from .what import find, subject_arguments


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT, which of its states, and FILE."""
    subject_arguments(parser)
    parser.add_argument("file", metavar="FILE", help="where to write the document")


def run(asked: Namespace) -> int:
    """Write the document with its texts as typed."""
    subject = find(asked)
    document = json.dumps(subject.design.dump(), indent=2, ensure_ascii=False) + "\n"
    write_file(asked.file, document.encode(), subject.file)
    return 0
