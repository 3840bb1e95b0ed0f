"""The chain of stages in two lines: contract of this project (interface.md), no outside source."""

from __future__ import annotations

from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from stagebook.tui.chain_picture import Link, picture
from stagebook.tui.figures import FigureRow
from stagebook.tui.shown import plain

from .sheets import check


def link(name: str, margin: float | None, *, old: bool = False) -> Link:
    found = check(f"duration:{name}:LS1", margin, stage=name)
    row = FigureRow(check=found, worst_known=True, nominal=margin, nominal_old=old, worst_old=old, before=None)
    return Link(name, row, True)


FLOOD = [
    link(name, margin)
    for name, margin in zip(
        ("probe", "amplifier", "latch", "timer", "driver", "piezo", "siren", "lamp"),
        (0.62, 0.41, 0.04, -0.36, 0.55, 0.3, -0.9, 0.2),
        strict=True,
    )
]


def test_names_figures_and_marks_stand_in_the_chain() -> None:
    names, figures = (plain(text) for text in picture(FLOOD[:5], 3, 80))
    assert names.split() == ["probe", "-->", "amplifier", "-->", "latch", "-->", "[timer]", "-->", "driver"]
    assert figures.split("   ")[0].strip() == "= +62"
    assert "! +4" in figures
    assert "X -36" in figures


def test_stages_out_of_sight_are_counted_with_the_worst_of_them() -> None:
    names, figures = (plain(text) for text in picture(FLOOD, 1, 50))
    assert "[amplifier]" in names
    hidden = int(names.rsplit(">", 1)[1])
    assert hidden == 8 - names.count("-->") - 1 - (int(names.split("<")[0]) if "<" in names else 0)
    assert "X -90" in figures


def test_old_figures_carry_their_mark() -> None:
    _, figures = picture([link("timer", 0.4, old=True)], 0, 40)
    assert "~" in plain(figures)
    assert figures[1].tone == "dim"


@given(st.lists(st.text(min_size=1, max_size=20), min_size=1, max_size=12), st.integers(60, 130), st.data())
def test_the_chain_fits_its_width_and_shows_the_chosen_stage(names: list[str], width: int, data: st.DataObject) -> None:
    chosen = data.draw(st.integers(0, len(names) - 1))
    shown, figures = picture([link(name, 0.5) for name in names], chosen, width)
    assert cell_len(plain(shown).rstrip()) <= width
    assert cell_len(plain(figures).rstrip()) <= width
    assert any(span.tone == "here" for span in shown)
