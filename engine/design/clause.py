"""What every piece of the design document shares: frozen, no unknown fields, and the texts that fields hold.

Texts are kept exactly as typed; whether they can be read is checked on the way in.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Annotated, Final

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, StrictBool, StrictFloat, StrictInt, StringConstraints

from ..quantity import read


class Clause(BaseModel):
    """A piece of the document: it never changes, and it refuses fields it does not know."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False, protected_namespaces=())


LARGEST_NUMBER: Final = 1e30


def _bounded(number: float) -> float:
    if abs(number) > LARGEST_NUMBER:
        raise ValueError(f"the number is too large; write one up to {LARGEST_NUMBER:g}")
    return number


def _readable(unit: str, least: float | None = None) -> Callable[[str], str]:
    def check(text: str) -> str:
        value = read(text, unit)
        if least is not None and value < least:
            raise ValueError(f"{text!r} is below {least:g} {unit}; write a value from {least:g} {unit} on")
        return text

    return check


_LINE = r"[^\x00-\x1f\x7f-\x9f]*"
_INK = r"[^\s\x00-\x1f\x7f-\x9f]"
TEXT_RULE = rf"^{_LINE}{_INK}{_LINE}$"
LINE_RULE = rf"^{_LINE}$"
NAME_RULE = rf"^{_INK}({_LINE}{_INK})?$"
STAGE_RULE = r"^[^\s\x00-\x1f\x7f-\x9f/:,]+$"
NET_RULE = r"^[^\s\x00-\x1f\x7f-\x9f:,;=]+$"
REF_RULE = r"^[A-Za-z][A-Za-z0-9_.\-]*$"
KEY_RULE = r"^[A-Za-z][A-Za-z0-9_]*$"
SLUG_RULE = r"^[A-Za-z][A-Za-z0-9_\-]*$"
DESIGN_RULE = r"^[^\s\x00-\x1f\x7f-\x9f/\-]([^\x00-\x1f\x7f-\x9f/]*[^\s\x00-\x1f\x7f-\x9f/])?$"
REMEDIES: Final = {
    TEXT_RULE: "write one line of visible text",
    LINE_RULE: "write it in one line",
    NAME_RULE: "write a name in one line without spaces at its ends",
    STAGE_RULE: "write a name without spaces and without / : , such as 'driver'",
    NET_RULE: "write a net name without spaces and without : , ; = such as 'base'",
    REF_RULE: "write a letter first, then letters, digits, _ . or - such as 'R7'",
    KEY_RULE: "write a letter first, then letters, digits and _",
    SLUG_RULE: "write a letter first, then letters, digits, _ and -",
    DESIGN_RULE: "write a name without / and without - at its start, such as 'flood'",
}
"""What to write instead of a text that a rule refuses."""

Text = Annotated[str, StringConstraints(max_length=200, pattern=TEXT_RULE)]
"""One line of visible text."""

Sentence = Annotated[str, StringConstraints(max_length=400, pattern=LINE_RULE)]
"""One line of text that may be empty."""

DesignName = Annotated[str, StringConstraints(max_length=60, pattern=DESIGN_RULE)]
"""A design's name on the shelf; one with ``/`` would be taken for a file."""

Name = Annotated[str, StringConstraints(max_length=60, pattern=NAME_RULE)]
"""A name of a sequence, a moment or a port: one line, no space at its ends."""

StageName = Annotated[str, StringConstraints(max_length=40, pattern=STAGE_RULE)]
"""A stage's name: no spaces and none of ``/ : ,`` because inner nets are ``stage/net`` and check ids use colons."""

NetName = Annotated[str, StringConstraints(max_length=100, pattern=NET_RULE)]
"""A net's name: no spaces and none of ``: , ; =``."""

Ref = Annotated[str, StringConstraints(max_length=30, pattern=REF_RULE)]
"""A reference designator such as ``R7``."""

Key = Annotated[str, StringConstraints(max_length=60, pattern=KEY_RULE)]
"""The name of a datum, a setting or a role."""

Slug = Annotated[str, StringConstraints(max_length=60, pattern=SLUG_RULE)]
"""The short name of a check or of a derating factor."""

Number = Annotated[StrictInt | StrictFloat, AfterValidator(_bounded)]
"""A bare number, in SI units."""

Scalar = StrictBool | Number | Text
"""A text with its unit as typed, a bare number in SI units, or yes / no."""

Volts = Annotated[Text, AfterValidator(_readable("V")), Field(examples=["6 V"])]
Ohms = Annotated[Text, AfterValidator(_readable("ohm", 0.0)), Field(examples=["0R5"])]
Farads = Annotated[Text, AfterValidator(_readable("F", 0.0)), Field(examples=["5 pF"])]
Seconds = Annotated[Text, AfterValidator(_readable("s", 0.0)), Field(examples=["1 s"])]
Delay = Annotated[Text, AfterValidator(_readable("s")), Field(examples=["0.5 s"])]
Slew = Annotated[Text, AfterValidator(_readable("V/s", 0.0)), Field(examples=["10 V/us"])]
Share = Annotated[Text, AfterValidator(_readable("")), Field(examples=["10 %"])]
