"""The ways from the bench to screens that only look at the draft."""

from __future__ import annotations

from pathlib import Path

from ...engine.results import Depth
from ...engine.studies.comparison import Side
from ..computing import Computing
from ..drafting import Drafting
from ..figures import FigureRow
from ..out_file import FileRefused
from ..remembered import Remembered
from ..sheet_files import write_sheets
from .bench_view import BEGUN, BenchView
from .compare import CompareScreen
from .dialog import Answers, Field, Form
from .faults import FaultsScreen
from .history import HistoryScreen
from .immunity import ImmunityScreen
from .origin import OriginPage
from .waves import WavesScreen

RAILS = ("supply", "0V")


class BenchWays(BenchView):
    """What :class:`BenchView` shows, seen from elsewhere."""

    def __init__(self, drafting: Drafting, computing: Computing, remembered: Remembered) -> None:
        super().__init__(drafting, computing, remembered)
        self._compare_waits = False

    def action_origin(self) -> None:
        """Where the chosen margin comes from."""
        if self.trouble:
            self.refuse(self.trouble, passing=False)
        elif self.chosen is None:
            self.refuse("there is no margin under the hand yet")
        elif self.figures.frozen and self.drafting.changes():
            self.refuse("the figures are held back; f shows them first")
        else:
            self.app.push_screen(self._origin_of(self.chosen))

    def _origin_of(self, row: FigureRow) -> OriginPage:
        return OriginPage(row.check, row.worst_known, self.drafting.name, self.design, self.computing)

    @property
    def _compared_with(self) -> Side | None:
        """The revision that the draft began from; of a design without one its state as its worst corners were first
        known."""
        base, begun = self.drafting.base, self.remembered.begun.get(self.drafting.name)
        if base is not None:
            return Side(f"r{base.number}", base.sheet, base.design)
        return None if begun is None else Side(BEGUN, begun[1], begun[0])

    def action_compare(self) -> None:
        """The draft beside the revision it began from, or before there is one beside what it was at first."""
        base, sheet = self._compared_with, self.figures.newest
        if base is None:
            self.refuse("nothing to compare with until the worst corners are known, or s has saved the first revision")
        elif self.figures.frozen:
            self.refuse("the figures are held back; f shows them first")
        elif self.trouble:
            self.refuse(f"nothing to compare: {self.trouble}")
        elif self._compare_waits:
            self._compare_waits = False
            self.say("no longer waiting to compare")
        elif sheet is None or sheet.depth is Depth.NOMINAL:
            self._compare_waits = True
            self.say(f"compared with {base.label} as soon as the corners are known; c again gives it up")
        else:
            self._compare_waits = False
            sides = [base, Side("draft", sheet, self.design)]
            self.app.push_screen(CompareScreen(self.drafting.name, sides, self.computing))

    def action_write(self) -> None:
        """Parts list and margins as CSV files, into a folder that is asked for."""
        sheet = None if self.figures.frozen or self.trouble else self.figures.newest
        if sheet is not None and sheet.depth is Depth.NOMINAL:
            sheet = None  # a nominal figure never stands where a worst one is read
        design, written = self.design, list[str]()

        def refusal(answers: Answers) -> str | None:
            try:
                written[:] = write_sheets(design, sheet, answers["folder"].strip() or ".")
            except FileRefused as refused:
                return str(refused)
            return None

        def done(answers: Answers | None) -> None:
            if answers is not None:
                without = "" if sheet is not None else "; the margins are not known yet"
                self.say(f"written: {' and '.join(written)}{without}", passing=True)

        hint = "parts list and margins, as CSV files that a spreadsheet opens"
        field = Field("folder", "folder", str(Path.cwd()), "a folder of yours", hint)
        self.app.push_screen(Form("Write parts list and margins", [field], refusal), done)

    def action_waves(self) -> None:
        """Voltages over time: first of the nets of the part under the hand, then of the loads."""
        loads = [ref for stage in self.design.stages for role, ref in stage.roles.items() if role.startswith("load")]
        refs = [*([] if self.ref is None else [self.ref]), *loads]
        nets = dict.fromkeys(net for ref in refs for net in self.design.part(ref).pins.values() if net not in RAILS)
        self.app.push_screen(WavesScreen(self.drafting.name, self.design, list(nets), self.computing))

    def action_faults(self) -> None:
        """What the draft does with each single fault."""
        self.app.push_screen(FaultsScreen(self.drafting.name, self.design, self.computing))

    def action_immunity(self) -> None:
        """How little charge trips an alarm of the draft, net by net."""
        self.app.push_screen(ImmunityScreen(self.drafting.name, self.design, self.computing))

    def action_history(self) -> None:
        """The revisions of this design."""

        def looked(moved: bool | None) -> None:
            if moved:
                self.begin()
                self.say(f"the draft goes on from r{self.drafting.draft.base_revision}")

        trend = self.chosen.check.id if self.chosen else None
        sheet = None if self.figures.frozen or self.figures.worst_old else self.figures.worst
        self.app.push_screen(HistoryScreen(self.drafting, self.computing, trend, sheet), looked)
