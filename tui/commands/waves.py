"""``stagebook waves``: voltages of the nominal run over time, to a CSV file."""

from __future__ import annotations

import csv
import io
import math
import sys
from argparse import ArgumentParser, ArgumentTypeError, Namespace

from ...engine.errors import QuantityError
from ...engine.quantity import read
from ..out_file import cell, check_target, write_file
from .waiting import prepare_solver
from .what import Subject, find, subject_arguments

MOST_TIMES = 10_000


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT, which run, what is read from it and the file."""
    subject_arguments(parser)
    parser.add_argument("--sequence", metavar="NAME", default="alarm", help="the sequence that is run (default: alarm)")
    parser.add_argument("--nets", metavar="A,B", type=_nets, help="the nets, with commas between (default: all)")
    parser.add_argument("--at", metavar="1ms,2s", type=_times, help="just these times (default: every step of the run)")
    parser.add_argument("--rtol", metavar="X", type=_tolerance, default=1e-3, help="relative tolerance (default 1e-3)")
    parser.add_argument(
        "--csv",
        metavar="FILE",
        required=True,
        help="where to write: time and voltages in SI units; a ' stands before names that a spreadsheet would compute",
    )


def run(asked: Namespace) -> int:
    """Run the sequence in its nominal lane and write the voltages with 17 digits."""
    subject = find(asked)
    nets = asked.nets or tuple(net for net in subject.design.nets if net != "0V")
    check_target(asked.csv, subject.file)
    prepare_solver(lambda: _answerable(subject, asked.sequence, nets, asked.at))
    # Imported here: it loads the compiler, which must find its folder chosen.
    from ...engine.studies.waves import waves

    found = waves(subject.design, asked.sequence, nets, at=asked.at, relative=asked.rtol)
    if found.carried is not None:
        print(f"stagebook waves: {found.carried}: of those there are no times", file=sys.stderr)
    text = io.StringIO()
    table = csv.writer(text, lineterminator="\n")
    table.writerow(("time", *map(cell, found.nets)))
    for time, row in zip(found.time, found.values, strict=True):
        table.writerow([f"{number:.17g}" for number in (time, *row)])
    write_file(asked.csv, text.getvalue().encode(), subject.file)
    return 0


def _answerable(subject: Subject, sequence: str, nets: tuple[str, ...], at: list[float] | None) -> None:
    from ...engine.circuit.circuit import build
    from ...engine.studies.waves import check_question

    check_question(build(subject.design), sequence, nets, at)


def _nets(text: str) -> tuple[str, ...]:
    names = tuple(name.strip() for name in text.split(","))
    if not all(names):
        raise ArgumentTypeError(
            f"{text!r} names an empty net; write net names with a comma between, such as base,supply"
        )
    return names


def _times(text: str) -> list[float]:
    try:
        times = [read(one, "s") for one in text.split(",")]
    except QuantityError as refusal:
        raise ArgumentTypeError(f"{refusal}, with commas between several") from refusal
    if min(times) < 0:
        raise ArgumentTypeError(f"{text!r} goes below 0 s, where the run begins; write times such as 1ms,2s")
    if len(times) > MOST_TIMES:
        raise ArgumentTypeError(f"{len(times)} times where at most {MOST_TIMES} can be asked for; ask in portions")
    return times


def _tolerance(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not 1e-12 <= value <= 1e-2:
        raise ArgumentTypeError(f"{text!r} cannot be the tolerance; write a number from 1e-12 to 1e-2, such as 1e-3")
    return value
