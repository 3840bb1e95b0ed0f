"""Supply entry: fuse, a diode against reversal, a clamp for surges, and an RC filter for the small stages."""

from __future__ import annotations

import math

from ..parts.physics import REFERENCE
from ..quantity import write
from .kind import RETURN_PORT, WORD, Json, Made, Place, Port, Setting, StageKind, Wire
from .plan import LARGEST_FILM, RETURN, Plan, class_figure

RIPPLE = 10e-3  # A at 1 uF, growing with the root of the capacitance: what an electrolytic bears, from memory
LOSS, LOSS_AT = 0.15, 100.0  # tan d and the frequency in Hz that it is given at, class, from memory
FUSE_SHARE, FUSE_DRIFT = 0.75, 0.003  # of its rating that a fuse carries for ever, and 1/K above 25 C, from memory
FUSE_OHMS = 0.1  # ohm of a fuse of 1 A, the less the more it carries, from memory
_FUSES = (0.1, 0.125, 0.16, 0.2, 0.25, 0.315, 0.4, 0.5, 0.63, 0.8, 1.0, 1.25, 1.6, 2.0, 2.5, 3.15, 4.0, 5.0, 6.3)
"""Rated currents in A: R10 series (ISO 3) as IEC 60127 has them, from memory."""
_CLAMPS = (15.0, 24.0)
IMPEDANCE = "2R"  # of what a surge comes through, from memory
SPARE = 3.0  # times its drop that the filter resistor is rated for: small stages draw more while they switch
_DIODES = {"silicon": ("diode", "1 A rectifier"), "schottky": ("schottky", "1 A Schottky")}
"""Kind and class."""
_COLDER = 2e-3  # V by which a junction drops more with each kelvin that it is colder, from memory
LOADS, SMALL = 0.3, 3e-3  # A that is reckoned with where nothing is known of what follows


def add_filter_capacitor(plan: Plan, farads: float, net: str) -> float:
    """The capacitor of a filter with its ripple rating and series resistance; returns its value in farad."""
    value = plan.capacitor(farads, net, RETURN, "filter_capacitor", snap="up")
    if value > LARGEST_FILM:
        ripple, series = RIPPLE * (value / 1e-6) ** 0.5, LOSS / (2.0 * math.pi * LOSS_AT * value)
        plan.parts[-1] |= {
            "ripple_rating": {"typical": write(ripple, "A", digits=2), "source": "memory"},
            "series_resistance": {"typical": write(series, "ohm", digits=2), "source": "memory"},
        }
    return value


def _loads(plan: Plan) -> float:
    """What all loads draw together at most, A: as written, or those of the row."""
    return plan.above_zero("load_current") if plan.text("load_current") else plan.beyond.loads or LOADS


def _small(plan: Plan) -> float:
    """What all small stages draw together, A: as written, or those of the row."""
    return plan.above_zero("small_current") if plan.text("small_current") else plan.beyond.small or SMALL


def _lost(plan: Plan, kind: str, name: str) -> float:
    """Forward voltage in V of the diode at what flows through it, cold: logarithmic between the points of its class."""
    low, high = (class_figure(kind, name, f"forward_{end}", "V").high for end in ("low", "high"))
    at_low, at_high = (class_figure(kind, name, f"forward_{end}_current", "A").typical for end in ("low", "high"))
    share = math.log((_loads(plan) + _small(plan)) / at_low) / math.log(at_high / at_low)
    return low + (high - low) * share + _COLDER * max(0.0, REFERENCE - plan.ambient.min)


def rated_fuse(plan: Plan, amps: float, a: str, b: str) -> float | None:
    """The least preferred fuse that carries a current for ever when hot, between two nets; returns its ohms, None where
    no usual one does."""
    hot = 1.0 - FUSE_DRIFT * max(0.0, plan.ambient.max - REFERENCE)
    rated = next((each for each in _FUSES if each >= amps / (FUSE_SHARE * hot)), None)
    if rated is None:
        return None
    fields = {
        "rated_current": {"typical": write(rated, "A"), "source": "memory"},
        "melting": {"typical": write(2.0 * rated**2, "A2s"), "source": "memory"},
        "resistance": {"typical": write(FUSE_OHMS / rated, "ohm", digits=2), "source": "memory"},
    }
    plan.part("F", "fuse", {"a": a, "b": b}, "fuse", **fields)
    return FUSE_OHMS / rated


def _add_fuse(plan: Plan, rail: str) -> float:
    """The fuse between the port ``feed`` and ``rail``; returns what it drops, V."""
    ohms = rated_fuse(plan, _loads(plan) + _small(plan), plan.port("feed"), rail)
    if ohms is None:
        most = f"{_FUSES[-1]:g} A x 0.7"
        raise plan.refused("load_current", f"no fuse of the usual ones carries it; write at most {most}")
    return (_loads(plan) + _small(plan)) * ohms


def _add_clamp(plan: Plan, rail: str) -> dict[str, Json]:
    """The clamp for a surge, and the sequence that has it; nothing where none is asked for."""
    if not plan.text("surge"):
        return {}
    surge = plan.above_zero("surge")
    standoff = next((each for each in _CLAMPS if each >= plan.supply.max), None)
    if standoff is None:
        raise plan.refused("surge", f"no clamp stands off {plan.supply.max:.3g} V; write none or a smaller supply")
    pins = {"anode": RETURN, "cathode": rail}
    plan.part("D", "clamp", pins, "clamp", value=f"{standoff:g} V", **{"class": f"{standoff:g} V surge clamp"})
    event = {
        "at": "1 s",
        "event": "surge",
        "to": write(surge, "V"),
        "for": "1 ms",
        "edge": "10 us",
        "impedance": IMPEDANCE,
    }
    events = [{"at": "0 s", "event": "connect supply", "rise": "20 ms"}, event]
    return {"surge": {"events": events, "ends": "2 s", "moments": {"standby": "0.9 s"}}}


def _make(plan: Plan) -> Made:
    name = plan.text("diode")
    feed, quiet = plan.port("feed"), plan.port("quiet")
    lost = plan.source * (_loads(plan) + _small(plan))
    if plan.text("fuse") != "none":
        fused = plan.port("rail") if name == "none" else plan.net("fused")
        lost += _add_fuse(plan, fused)
        feed = fused
    rail = feed
    if name != "none":
        kind, generic = _DIODES[name]
        rail = plan.port("rail")
        lost += _lost(plan, kind, generic)
        plan.diode(feed, rail, "reverse_diode", kind=kind, name=generic)
    surges = _add_clamp(plan, rail)
    current, drop, slew = _small(plan), plan.above_zero("drop"), plan.above_zero("slew")
    ohms = plan.resistor(drop / current, rail, quiet, "filter_resistor", snap="down", volts=SPARE * drop)
    farads = add_filter_capacitor(plan, plan.supply.max / (ohms * slew), quiet)
    settles = 5.0 * ohms * farads
    return Made(rail_drop=lost, quiet_drop=lost + ohms * current, settles=settles, sequences=surges)


KIND = StageKind(
    name="entry",
    title="supply entry",
    place=Place.FEED,
    help=(
        "A fuse of at least 1.33 I of what follows, more when hot (0.3 %/K). A series diode keeps a reversed supply"
        " away from all that follows; loads are fed right behind it, small stages behind an RC filter, so that neither"
        " a fast connection nor the surge of the load reaches them. What follows gets V less the diode's drop at the"
        " current of the loads (read from the row) and the fuse's. R = drop / I of the small stages; C = V_max / (R x"
        " slew), because an RC filter lets a step of V through no faster than V/(RC). A clamp stands off V_max and"
        " holds a surge below the ratings behind it. Source: common practice; RC step response."
    ),
    ports=(
        Port("feed", Wire.RAIL, "the supply as it arrives"),
        Port("rail", Wire.NEW_RAIL, "the rail of loads, behind the diode"),
        Port("quiet", Wire.NEW_QUIET, "the rail of small stages, behind the filter"),
        RETURN_PORT,
    ),
    settings=(
        Setting("load_current", "A", "", "all loads together at most; empty: those of the row"),
        Setting("fuse", WORD, "slow", "in series with the supply", ("slow", "none")),
        Setting("surge", "V", "", "highest voltage of a surge of 1 ms; empty: no clamp"),
        Setting("diode", WORD, "silicon", "against reversal: a rectifier, or one that drops less", (*_DIODES, "none")),
        Setting("small_current", "A", "", "all small stages together; empty: those of the row"),
        Setting("drop", "V", "0.3 V", "what the filter may lose at that current"),
        Setting("slew", "V/s", "5 V/ms", "how fast the filtered rail may rise when the supply is snapped on"),
    ),
    make=_make,
    takes=(),
)
