"""Stages of the catalogue in words for the screen: what a kind is, what was asked of a stage, what a form asks."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from ..engine.design.part import Stage
from ..engine.stages import stage_kinds
from ..engine.stages.kind import StageKind
from ..engine.stages.modified import AS_MADE, is_modified
from ..engine.stages.row import Choice
from .shown import fit

Rows = list[tuple[str, str, str]]
_TITLE = 26


def kind_choices() -> list[tuple[str, str]]:
    """Every kind with the beginning of what it is, in the order in which a signal meets them."""
    return [(name, f"{fit(kind.title, _TITLE)} {kind.help}") for name, kind in stage_kinds().items()]


def asked(choice: Choice) -> str:
    """What was asked of a stage, where it differs from the usual: ``time 90 s, mode reset``."""
    kind = stage_kinds()[choice.kind]
    given = {s.name: choice.settings[s.name] for s in kind.settings if s.name in choice.settings}
    words = [f"{_plain(s.name)} {given[s.name]}" for s in kind.settings if given.get(s.name, s.usual) != s.usual]
    return ", ".join(words) or "as usual"


def hint(kind: StageKind, name: str) -> str:
    """What a setting is for, with its choices."""
    setting = kind.setting(name)
    assert setting is not None
    choices = f": {', '.join(setting.choices)}" if setting.choices else ""
    return f"{_plain(name)}: {setting.about}{choices and ' (' + choices[2:] + ')'}"


def setting_label(name: str) -> str:
    """A setting's name as it stands in a form."""
    return _plain(name)


def kind_rows(kind: StageKind) -> Rows:
    """What a kind is: name, text and tone of each row."""
    rows: Rows = [("kind", kind.title, ""), ("how it is sized", kind.help, "")]
    rows += [
        (_plain(s.name), f"usual {s.usual or '-'}: {hint(kind, s.name).partition(': ')[2]}", "") for s in kind.settings
    ]
    return rows


def stage_rows(stage: Stage, doubts: Sequence[str] = ()) -> Rows:
    """Where a stage comes from: its kind, whether it is modified, what will not hold of it, what was asked of it, its
    ports."""
    kind = stage_kinds().get(stage.kind)
    if kind is None:
        return [("kind", f"{stage.kind}: its parts were put in by hand", "")]
    rows: Rows = [("kind", kind.title, "")]
    if is_modified(stage):
        rows.append(("modified", "its parts are not those that the catalogue made", "thin"))
    rows += [("! will not hold", words, "thin") for words in doubts]
    rows.append(("how it is sized", kind.help, ""))
    rows += [(_plain(name), _setting(kind, name, stage.settings), "") for name in stage.settings if name != AS_MADE]
    about = {port.name: port.about for port in kind.ports}
    rows += [(f"port {name}", f"net {net}: {about.get(name, '')}", "") for name, net in stage.ports.items()]
    return rows


def _setting(kind: StageKind, name: str, settings: Mapping[str, object]) -> str:
    known = kind.setting(name.removesuffix(f"_{AS_MADE}"))
    return f"{settings[name]}" + (f": {known.about}" if known is not None else "")


def _plain(name: str) -> str:
    return name.replace("_", " ")
