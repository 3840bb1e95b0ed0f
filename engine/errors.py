"""The exception family of the engine. Each message says what is wrong, where, and what to write instead."""


class EngineError(Exception):
    """Any refusal of the engine, in one line that can be shown as it is."""


class DesignError(EngineError):
    """The design document cannot be used as written."""


class QuantityError(EngineError, ValueError):
    """A text cannot be read as a value."""


class CircuitError(DesignError):
    """The circuit that the document describes cannot be computed."""


class Cancelled(EngineError):
    """The caller asked to stop."""
