"""Whether a stage of the catalogue is still as it was made."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence

from ..design.part import Stage
from .kind import Json

AS_MADE = "as_made"
"""The setting that keeps what the parts were when the stage was made."""
_DIGITS = 12


def asked(settings: Mapping[str, object]) -> dict[str, str]:
    """The settings of a stage that were asked for, without what the catalogue notes beside them: ``as_made``, and
    ``held_as_made`` for a setting that was left empty."""
    return {name: str(text) for name, text in settings.items() if not name.endswith(AS_MADE)}


def digest(parts: Sequence[Json], ports: Mapping[str, str]) -> str:
    """A short sum over parts as JSON values; nets of ports count by the port's name: connecting it changes nothing."""
    names = {net: f"port {port}" for port, net in ports.items()}
    written = [{**part, "pins": {pin: names.get(net, net) for pin, net in part["pins"].items()}} for part in parts]
    return hashlib.sha256(json.dumps(written, sort_keys=True).encode()).hexdigest()[:_DIGITS]


def is_modified(stage: Stage) -> bool:
    """Whether parts of a stage were changed, added or removed since the catalogue made it; never for a free stage."""
    made = stage.settings.get(AS_MADE)
    if made is None:
        return False
    parts = [part.model_dump(mode="json", by_alias=True, exclude_unset=True) for part in stage.parts]
    return digest(parts, stage.ports) != made
