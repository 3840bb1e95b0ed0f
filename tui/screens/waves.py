"""Waves: the nominal run as voltages of chosen nets over time, with a cursor that reads them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, ClassVar, cast

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.design.document import Design
from ...engine.quantity import read
from ..actions import bindings
from ..computing import Computing
from ..messages import Answered, AnswerRefused, SolverPreparing
from ..shown import Span, line
from ..wave_picture import LEAST_ROWS, MOST_ROWS, Scale, marks_of, moment_words, reading, scale_of, strip_of, volts
from ..widgets.lines import Lines
from ..widgets.rule import Rule
from ..widgets.wave_plot import WavePlot
from .dialog import Mark as Marking
from .page import Page
from .study_page import BY_ITSELF, COMPUTING, PREPARING

if TYPE_CHECKING:
    from ...engine.studies.waves import Waves

MOST_NETS = 6
FAR = 8  # columns
ZOOM = 4.0


class WavesScreen(Page[None]):
    """One sequence of one design. State: what was computed, the nets in sight, the window of time, the cursor."""

    WHERE = "waves"
    BINDINGS: ClassVar[list[BindingType]] = bindings("waves")

    def __init__(self, design_name: str, design: Design, nets: Sequence[str], computing: Computing) -> None:
        super().__init__()
        self._of = design_name
        self._design = design
        self._nets = list(nets)[:MOST_NETS]
        self._computing = computing
        self._sequence = "alarm"
        self._waves: Waves | None = None
        self._window = (0.0, 1.0)
        self._stretched = True
        self._ascii = False
        self._cursor = 0
        self._request = 0
        self._progress = ""
        self._nothing_yet = ""

    def compose_body(self) -> ComposeResult:
        """Title, the moment under the cursor with its values, the picture."""
        yield Lines(id="title")
        yield Lines(id="moment")
        yield Lines(id="readings")
        yield Rule()
        yield WavePlot(id="plot")

    def on_mount(self) -> None:
        """Asks for the run."""
        self.query_one(WavePlot).focus()
        self._ascii = (self.app.console.encoding or "").lower().replace("-", "") not in ("utf8", "utf16")
        self._ask()

    def on_unmount(self) -> None:
        """Nobody looks any more."""
        self._computing.cancel_aside()

    def on_resize(self) -> None:
        """Another width: other columns."""
        self.call_after_refresh(self._show)

    def _ask(self) -> None:
        self._waves = None
        self._progress = f"~ {COMPUTING}"
        self._window = (0.0, read(self._design.sequences[self._sequence].ends, "s"))
        self._nothing_yet = f"{COMPUTING}; {BY_ITSELF}"
        self._request = self._computing.waves(self._design, self._sequence, self.post_message)
        self._show()

    @property
    def window(self) -> tuple[float, float]:
        """The time in sight, s."""
        return self._window

    @property
    def moment(self) -> float:
        """The moment under the cursor, s."""
        return self._scale().moment(self._cursor)

    @property
    def nets(self) -> tuple[str, ...]:
        """The nets that are drawn."""
        return tuple(self._nets)

    # -- showing

    def _scale(self) -> Scale:
        columns, _ = self.query_one(WavePlot).room
        marks = marks_of(self._design, self._sequence)
        return scale_of(*self._window, marks, columns, stretched=self._stretched)

    def _show(self) -> None:
        title = Span(f" {self._of}: waves of {self._sequence}", "strong")
        how = "stretched behind events" if self._stretched else "even"
        self.query_one("#title", Lines).show(line(title, f"   time {how}   {self._progress}"))
        if self._waves is None:
            self.query_one("#moment", Lines).show(line(f" {self._nothing_yet}"))
            self.query_one("#readings", Lines).show()
            return
        plot, scale = self.query_one(WavePlot), self._scale()
        rows = plot.room[1]
        nets = self._nets[: max(1, rows // LEAST_ROWS)]
        each = max(1, min(MOST_ROWS, rows // max(1, len(nets))))
        strips = [strip_of(self._waves, net, scale, each, ascii_only=self._ascii) for net in nets]
        self._cursor = max(0, min(self._cursor, scale.columns - 1))
        plot.show(strips, scale, self._cursor)
        self._show_moment(scale)

    def _show_moment(self, scale: Scale) -> None:
        if self._waves is None:
            return
        marks = marks_of(self._design, self._sequence)
        self.query_one("#moment", Lines).show(line(f" at {moment_words(scale, marks, self._cursor)}"))
        moment = scale.moment(self._cursor)
        values = "   ".join(f"{net} {volts(reading(self._waves, net, moment))}" for net in self._nets)
        self.query_one("#readings", Lines).show(line(Span(f" {values}", "strong")))

    def on_answered(self, event: Answered) -> None:
        """The run is known."""
        if event.request == self._request:
            self._waves = cast("Waves", event.found).filled()
            self._nets = [net for net in self._nets if net in self._waves.nets] or list(self._waves.nets[:4])
            self._progress = "" if self._waves.carried is None else "~ some periods are drawn like those before"
            self._show()

    def on_answer_refused(self, event: AnswerRefused) -> None:
        """The circuit cannot be computed as it stands."""
        if event.request == self._request:
            self._progress = "not computed"
            self._nothing_yet = "nothing can be drawn; the reason stands below"
            self._show()
            self.refuse(event.reason, passing=False)

    def on_solver_preparing(self, event: SolverPreparing) -> None:
        """The first start on this machine."""
        self._progress = "preparing the solver" if event.busy else f"~ {COMPUTING}"
        self._nothing_yet = f"{PREPARING if event.busy else COMPUTING}; {BY_ITSELF}"
        self._show()

    # -- the cursor

    def _move(self, column: int) -> None:
        scale = self._scale()
        self._cursor = max(0, min(column, scale.columns - 1))
        self.query_one(WavePlot).move_cursor(self._cursor)
        self._show_moment(scale)

    def on_wave_plot_pointed(self, event: WavePlot.Pointed) -> None:
        """The cursor goes where the mouse points."""
        self._move(event.column)

    def action_left(self) -> None:
        """One column earlier."""
        self._move(self._cursor - 1)

    def action_right(self) -> None:
        """One column later."""
        self._move(self._cursor + 1)

    def action_far_left(self) -> None:
        """Some columns earlier."""
        self._move(self._cursor - FAR)

    def action_far_right(self) -> None:
        """Some columns later."""
        self._move(self._cursor + FAR)

    def action_first(self) -> None:
        """To the begin of the window."""
        self._move(0)

    def action_last(self) -> None:
        """To its end."""
        self._move(self._scale().columns - 1)

    def action_next_event(self) -> None:
        """To the next event in sight, after the last one to the first."""
        places = [column for column, _ in self._scale().marks]
        if places:
            self._move(next((place for place in places if place > self._cursor), places[0]))

    # -- the window

    def action_closer(self) -> None:
        """A quarter of the window, around the cursor."""
        self._zoom(1.0 / ZOOM)

    def action_wider(self) -> None:
        """Four times the window, up to the whole sequence."""
        self._zoom(ZOOM)

    def _zoom(self, factor: float) -> None:
        scale, (start, end) = self._scale(), self._window
        moment = scale.moment(self._cursor)
        whole = read(self._design.sequences[self._sequence].ends, "s")
        span = min(whole, max((end - start) * factor, 1e-9))
        start = max(0.0, min(moment - 0.5 * span, whole - span))
        self._window = (start, start + span)
        self._cursor = self._scale().column(moment)
        self._show()

    def action_whole(self) -> None:
        """The whole sequence."""
        moment = self._scale().moment(self._cursor)
        self._window = (0.0, read(self._design.sequences[self._sequence].ends, "s"))
        self._cursor = self._scale().column(moment)
        self._show()

    def action_even(self) -> None:
        """Time even, or stretched behind events."""
        moment = self._scale().moment(self._cursor)
        self._stretched = not self._stretched
        self._cursor = self._scale().column(moment)
        self._show()

    def action_plain(self) -> None:
        """ASCII signs only, or dots."""
        self._ascii = not self._ascii
        self._show()

    # -- what is shown

    def action_sequence(self) -> None:
        """The next sequence of the design."""
        names = list(self._design.sequences)
        if len(names) < 2:
            self.refuse("the design has one sequence only")
            return
        self._sequence = names[(names.index(self._sequence) + 1) % len(names)]
        self._cursor = 0
        self._ask()

    def action_nets(self) -> None:
        """Which nets are drawn."""
        if self._waves is None:
            return
        known = [net for net in self._design.nets if net in self._waves.nets]

        def chosen(nets: list[str] | None) -> None:
            if nets:
                self._nets = nets
                self._show()

        title = f"nets to draw, up to {MOST_NETS}"
        self.app.push_screen(Marking(title, [(net, net) for net in known], self._nets, MOST_NETS), chosen)
