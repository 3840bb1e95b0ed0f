"""The actions of the screen in front, found by name: fed from the registry of actions."""

from __future__ import annotations

from functools import partial

from textual.command import DiscoveryHit, Hit, Hits, Provider

from .actions import Action, of
from .screens.page import Page


class ActionFinder(Provider):
    """Offers what the keys of the screen in front offer."""

    async def discover(self) -> Hits:
        """Everything, before anything is typed."""
        for action in self._actions():
            yield DiscoveryHit(action.label, partial(self.screen.run_action, action.name), help=_help(action))

    async def search(self, query: str) -> Hits:
        """What matches the typed text."""
        matcher = self.matcher(query)
        for action in self._actions():
            score = matcher.match(f"{action.label} {action.help}")
            if score > 0:
                yield Hit(score, action.label, partial(self.screen.run_action, action.name), help=_help(action))

    def _actions(self) -> tuple[Action, ...]:
        return of(self.screen.WHERE) if isinstance(self.screen, Page) else ()


def _help(action: Action) -> str:
    return f"{action.shown}: {action.help}"
