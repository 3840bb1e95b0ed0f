"""Low-side drivers: a saturated npn transistor, or a Darlington where little base current is at hand."""

from __future__ import annotations

from functools import partial

from ..quantity import write
from .heat import cooled
from .kind import IN_PORT, RAIL_PORT, RETURN_PORT, Drive, Intake, Made, Place, Port, Sense, Setting, StageKind, Wire
from .loads import LOAD_SETTINGS, NONE, add_load, both, carried, doubtful, drawn, load_requirements, peak, switched
from .plan import DRIVER_CURRENT, RETURN, V_BE, Plan, class_figure

BLEED = 0.1  # share of the base current that the base-emitter resistor may take (common practice)
SATURATED = {1: 0.3, 2: 1.1}  # V across a transistor that is fully on, and across a Darlington, from memory
PEAK = 0.8  # of its rated current that an inrush may take: the customary 20 % to spare
HOT = {1: 0.5, 2: 2.0}  # V, the same at most, for what it heats, from memory
LEAST_BLEED, MOST_BLEED = 1e3, 47e3  # ohm


def _base(plan: Plan, kind: str, junctions: int) -> tuple[float, float]:
    """Base current in A, and the base-emitter resistor in ohm that takes little of it."""
    base = carried(plan) / plan.gain(kind, peak(plan))
    return base, min(max(junctions * V_BE / (BLEED * base), LEAST_BLEED), MOST_BLEED)


def _intake(plan: Plan, kind: str, junctions: int) -> Intake:
    base, bleed = _base(plan, kind, junctions)
    return Intake(base + junctions * V_BE / bleed)


def _make(plan: Plan, kind: str, junctions: int) -> Made:
    base, bleed = _base(plan, kind, junctions)
    node, low = plan.net("base"), plan.port("low")
    drop = junctions * V_BE
    ohms = (plan.arriving - drop) / (base + drop / bleed) - plan.arriving_ohms
    current, two = switched(plan), both(plan)
    if kind == "npn" and peak(plan) > DRIVER_CURRENT:
        inrush, most = (write(each, "A") for each in (peak(plan), DRIVER_CURRENT))
        raise plan.refused(
            "current",
            f"an inrush of {inrush} is more than the {most} that 0.5 A transistors are used for;"
            f" {two and two + ', or '}take a Darlington driver",
        )
    if ohms < 1.0:
        raise plan.refused(
            "current",
            f"its base current of {write(base, 'A')} does not come through the stage before; write a smaller current"
            + ("" if kind.startswith("darlington") else ", or take a Darlington driver"),
        )
    plan.resistor(ohms, plan.port("in"), node, "base_resistor", snap="down")
    plan.resistor(bleed, node, RETURN, "base_emitter_resistor")
    plan.transistor(low, node, RETURN, "driver", kind=kind, current=peak(plan))
    hot = current * plan.supply.max / plan.supply.nominal
    doubts = cooled(plan, kind, hot, HOT[junctions], inrush=plan.next.surge is not None)
    bears = class_figure(kind, plan.transistor_class(kind, peak(plan)), "i_c_max", "A").low
    if peak(plan) > PEAK * bears:
        inrush = write(peak(plan), "A")
        doubts += (
            f"peak_current: an inrush of {inrush} leaves no 20 % of the {bears:g} A that it bears;"
            f" {two or 'switch less'}",
        )
    farads = plan.quieting((kind, peak(plan), plan.supply.max))
    plan.capacitor(farads, node, RETURN, "base_capacitor_driver", snap="up")
    if plan.text("load") != NONE:
        add_load(plan, plan.text("load"), plan.port("rail"), low)
    lost = SATURATED[junctions]
    own = plan.text("load") != NONE
    return Made(
        output=Drive(Sense.LOW_SIDE, drop=lost),
        requirements=load_requirements(plan),
        doubts=(*doubts, *(doubtful(plan, lost) if own else ())),
    )


_PORTS = (IN_PORT, RAIL_PORT, Port("low", Wire.OUT, "the switched end of the load"), RETURN_PORT)
KINDS = (
    StageKind(
        name="low_side_driver",
        called="driver",
        title="low-side driver",
        place=Place.SWITCH,
        help=(
            "An npn transistor that pulls the load to 0V. I_B = overdrive x I_load / h_FE,min of the coldest ambient;"
            " R_B = (V_drive,min - V_BE) / (I_B + V_BE/R_BE), less the resistance of the stage before, next lower"
            " preferred value; R_BE takes about a tenth of the base current and drains leakage when hot. Source: common"
            " practice (forced gain 10, overdrive 2 to 5)."
        ),
        ports=_PORTS,
        settings=(*LOAD_SETTINGS, Setting("overdrive", "", "3", "times the least base current")),
        make=partial(_make, kind="npn", junctions=1),
        intake=partial(_intake, kind="npn", junctions=1),
        draws=drawn,
    ),
    StageKind(
        name="darlington_driver",
        called="driver",
        title="Darlington driver",
        place=Place.SWITCH,
        help=(
            "As the low-side driver, with a Darlington transistor for loads of amperes or a weak stage before it."
            " Its h_FE,min is the product of both gains and its V_BE counts twice, V_CE(sat) is 0.8 to 2 V, so that the"
            " load loses that much of a low supply. I_B = overdrive x I_load / h_FE,min; R_B = (V_drive,min - 2 V_BE) /"
            " (I_B + 2 V_BE/R_BE). Where I V_CE(sat) R_th would heat its junction too much it comes on a heat sink."
            " Source: common practice; the class is from memory."
        ),
        ports=_PORTS,
        settings=(*LOAD_SETTINGS, Setting("overdrive", "", "3", "times the least base current")),
        make=partial(_make, kind="darlington_npn", junctions=2),
        intake=partial(_intake, kind="darlington_npn", junctions=2),
        draws=drawn,
    ),
)
