"""Machine code of the kernel: called, and loaded without the compiler that made it.

A process that is handed code (:func:`adopt`) before anything else of the kernel is imported does without numba, whose
import and dispatch take longer than a small study. Code is one line of JSON, with what it may run on, and then the
object files that the line tells the lengths of.
"""

from __future__ import annotations

import ctypes
import hashlib
import json
from collections.abc import Callable, Iterable
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

Table = NDArray[np.int64]

FORMAT = 2
WIDTH = 8
"""Lanes of a row."""


class Entry(NamedTuple):
    """A function of the kernel in machine code: what it takes, and what keeps it in memory."""

    function: Any
    kinds: str
    keep: Any


_loaded: dict[str, Entry] | None = None
_FUNCTION = ctypes.CFUNCTYPE(ctypes.c_int, ctypes.c_void_p, ctypes.c_void_p, ctypes.c_void_p)


def loaded() -> bool:
    """Whether there is code to call."""
    return _loaded is not None


def processor() -> str:
    """What code is made for and may not be run without."""
    from llvmlite import binding

    said = f"{binding.get_process_triple()} {binding.get_host_cpu_name()} {binding.get_host_cpu_features().flatten()}"
    return hashlib.sha256(said.encode()).hexdigest()


def packed(objects: Iterable[tuple[str, str, str, bytes]]) -> bytes:
    """Code of (entry, kinds of its arguments, symbol, object file) each, made on this processor."""
    listed = list(objects)
    rest = b"".join(code for *_, code in listed)
    head = {
        "format": FORMAT,
        "processor": processor(),
        "sha256": hashlib.sha256(rest).hexdigest(),
        "entries": [[name, kinds, symbol, len(code)] for name, kinds, symbol, code in listed],
    }
    return json.dumps(head).encode() + b"\n" + rest


def adopt(code: bytes) -> None:
    """Load code and call it from now on. Raises ValueError where it is damaged or made for another processor."""
    global _loaded
    line, _, rest = code.partition(b"\n")
    try:
        head = json.loads(line)
        suits = head["format"] == FORMAT and head["processor"] == processor()
        whole = head["sha256"] == hashlib.sha256(rest).hexdigest()
    except (KeyError, TypeError, ValueError) as error:
        raise ValueError("this is no machine code of the kernel") from error
    if not suits:
        raise ValueError("the code was made for another processor")
    if not whole:
        raise ValueError("the code is damaged")
    from llvmlite import binding

    binding.initialize_native_target()
    binding.initialize_native_asmprinter()
    entries, begin = {}, 0
    for name, kinds, symbol, length in head["entries"]:
        machine = binding.Target.from_default_triple().create_target_machine()
        engine = binding.create_mcjit_compiler(binding.parse_assembly(""), machine)
        engine.add_object_file(binding.ObjectFileRef.from_data(rest[begin : begin + length]))
        engine.finalize_object()
        entries[name] = Entry(_FUNCTION(engine.get_function_address(symbol)), kinds, engine)
        begin += length
    _loaded = entries


def bound(name: str, arguments: tuple[Any, ...]) -> Callable[[], None]:
    """An entry that is ready to be called, as often as wanted, with arrays, tuples of arrays and whole numbers.

    Raises ValueError where they are not such as it takes: it reads what lies at their addresses. The interpreter is
    free while it runs.
    """
    if _loaded is None:
        # Nobody had kept any code: it is made for this process alone.
        from .compiling import compiled_code

        adopt(compiled_code())
    assert _loaded is not None
    entry = _loaded[name]
    table, kinds = flattened(arguments)
    if kinds != entry.kinds:
        raise ValueError(f"the kernel's {name} takes {entry.kinds}, not {kinds}")

    def called() -> None:
        said, fault = ctypes.c_void_p(), ctypes.c_void_p()
        if entry.function(ctypes.addressof(said), ctypes.addressof(fault), table.ctypes.data) != 0:
            raise RuntimeError(f"the kernel's {name} failed")

    # What the table holds the addresses of must stay where it is.
    called.arguments = arguments  # type: ignore[attr-defined]
    return called


def flattened(arguments: tuple[Any, ...]) -> tuple[Table, str]:
    """Address and shape of every array and every number, in their order: what an entry unpacks; and their kinds, an
    array's as its type and number of dimensions."""
    numbers: list[int] = []
    kinds: list[str] = []
    _flatten(arguments, numbers, kinds)
    return np.array(numbers, dtype=np.int64), " ".join(kinds)


class Flat:
    """Arguments that are flattened once and for all; they stay where they are as long as this is kept."""

    def __init__(self, value: tuple[Any, ...]) -> None:
        self.value = value
        self.numbers: list[int] = []
        self.kinds: list[str] = []
        _flatten(value, self.numbers, self.kinds)


def _flatten(value: Any, numbers: list[int], kinds: list[str]) -> None:
    if isinstance(value, Flat):
        numbers.extend(value.numbers)
        kinds.extend(value.kinds)
    elif isinstance(value, tuple):
        for one in value:
            _flatten(one, numbers, kinds)
    elif isinstance(value, np.ndarray):
        said = value.__array_interface__
        if said["strides"] is not None and not value.flags.c_contiguous:
            raise ValueError("an array of the kernel must be contiguous")
        shape = said["shape"]
        numbers.append(said["data"][0])
        numbers.extend(shape)
        kinds.append(f"{said['typestr'][1:]}:{len(shape)}")
    else:
        numbers.append(int(value))
        kinds.append("number")
