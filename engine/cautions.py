"""Cautions that come with parts and stages: usual practice; local codes and licensed practice decide."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from .design.document import Design
from .design.part import Part
from .errors import QuantityError
from .quantity import read

_FLASHERS = ("astable",)
_SEIZURE = 2.0  # Hz from which flashes are warned of: below 3 Hz, with room for tolerances


@dataclass(frozen=True, slots=True)
class Caution:
    """Something to be careful about, and where it comes from: ``about`` are the parts and stages that bring it.

    ``title`` names it where there is no room for the words.
    """

    key: str
    title: str
    words: str
    about: tuple[str, ...] = ()


def _polarised(part: Part) -> bool:
    return part.kind == "capacitor" and "plus" in part.pins


def _powerful(part: Part) -> bool:
    """A lamp with a filament, or a resistor rated for a watt or more."""
    if part.kind == "lamp":
        return True
    try:
        return part.kind == "resistor" and isinstance(part.rating, str) and read(part.rating, "W") >= 1.0
    except QuantityError:
        return False


def _kinds(*names: str) -> Callable[[Part], bool]:
    return lambda part: part.kind in names


_OF_PARTS: tuple[tuple[str, str, str, Callable[[Part], bool]], ...] = (
    (
        "mains",
        "mains on relays",
        "Mains on relay contacts: isolation, clearances, fuse, a qualified person. Flyback and clamp parts are safety"
        " parts.",
        lambda part: part.kind == "coil" or part.operated_by is not None,
    ),
    (
        "battery",
        "batteries",
        "Batteries: fuse at the battery terminal; never charge primary cells; lead-acid gives off explosive gas,"
        " ventilate; check polarity before connecting.",
        _kinds("battery"),
    ),
    (
        "electrolytic",
        "electrolytics",
        "Electrolytics: polarity and voltage; discharge before touching; stored charge remains.",
        _polarised,
    ),
    (
        "sounder",
        "loud sounders",
        "Sounders: 110 dB(A) allows about 1.5 minutes a day; muffle at the bench; local limits on how long an alarm may"
        " sound.",
        _kinds("sounder", "piezo"),
    ),
    ("hot", "hot parts", "Filament lamps and power resistors burn.", _powerful),
    ("probe", "probes in water", "Probes in water only on isolated low voltage.", _kinds("probe")),
    (
        "safety_part",
        "safety parts",
        "Fuse, clamp, flyback, mains relay and charger parts are never offered as free substitutes; waiving a check of"
        " surge, reversal, fuse or charge asks for a second name.",
        _kinds("fuse", "clamp"),
    ),
)
PURPOSE = Caution(
    "purpose",
    "what it is for",
    "Not for fire, gas, medical or sole protection of life: use listed equipment. A PASS is not compliance with any"
    " standard, and margins are not approval.",
)
FLASHING = "Flashing lights near or above 3 Hz can trigger seizures."


def cautions_of(design: Design) -> tuple[Caution, ...]:
    """The cautions that the parts and stages of a design bring, the one about its purpose first."""
    found = [PURPOSE]
    for key, title, words, brings in _OF_PARTS:
        about = tuple(
            part.ref for part in design.parts if brings(part) or (key == "safety_part" and _protects(design, part))
        )
        if about:
            found.append(Caution(key, title, words, about))
    flashers = tuple(stage.name for stage in design.stages if stage.kind in _FLASHERS and _is_fast(stage.settings))
    if flashers:
        found.append(Caution("flashing", "flashing lights", FLASHING, flashers))
    return tuple(found)


def _protects(design: Design, part: Part) -> bool:
    """Whether a part has a role that keeps others from harm."""
    roles = {role for role, ref in design.stage_of(part.ref).roles.items() if ref == part.ref}
    return bool(roles & {"flyback_diode", "clamp", "fuse", "reverse_diode", "charge_resistor", "charge_diode"})


def _is_fast(settings: object) -> bool:
    period = settings.get("period") if isinstance(settings, dict) else None
    try:
        return period is None or read(str(period), "s") <= 1.0 / _SEIZURE
    except QuantityError:
        return True
