"""The map of a design: its chain of stages, each with its weakest margin."""

from __future__ import annotations

from collections.abc import Sequence

from ..chain_picture import Link, picture
from .lines import Lines


class Chain(Lines):
    """Two lines at the head of a screen. The owner says which stage is chosen."""

    def __init__(self, id: str | None = None) -> None:
        super().__init__(id=id)
        self._links: tuple[Link, ...] = ()
        self._chosen = 0

    def show_chain(self, links: Sequence[Link], chosen: int) -> None:
        """Shows these stages around the chosen one."""
        self._links, self._chosen = tuple(links), chosen
        self._draw()

    def on_resize(self) -> None:
        """Another width shows more or fewer stages."""
        self._draw()

    def _draw(self) -> None:
        if self.size.width:
            self.show(*picture(self._links, self._chosen, self.size.width))
