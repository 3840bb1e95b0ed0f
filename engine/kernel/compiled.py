"""How kernel functions are compiled: by numba where it is installed, otherwise they run as plain Python.

Where their machine code is loaded already (:mod:`.machine_code`) they are left as they are: nobody calls them.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from typing import Any, TypeVar

from . import machine_code

Function = TypeVar("Function", bound=Callable[..., object])

PARTS: set[str] = set()
"""Names of the functions that are compiled as parts of others."""

try:
    if os.environ.get("STAGEBOOK_UNCOMPILED"):
        raise ImportError
    COMPILED = True
    HERE = not machine_code.loaded()
    """Whether functions are compiled in this process."""
    if HERE:
        import numba

        jit: Any = numba.njit
except ImportError:
    COMPILED = HERE = False

if not HERE:

    def compiled(function: Function) -> Function:
        """Leave the function as it is: correct, but some hundred times slower."""
        return function

    leaf = part = compiled

else:

    def compiled(function: Function) -> Function:
        """Compile on first use, releasing the interpreter lock; machine code is kept in the user's cache folder."""
        made: Function = jit(nogil=True, cache=True, error_model="numpy")(function)
        return made

    def _called(function: Function, inlined: bool) -> Function:
        options = {"_nrt": False, "no_cpython_wrapper": True, "no_cfunc_wrapper": True, "forceinline": inlined}
        try:
            made: Function = jit(nogil=True, error_model="numpy", **options)(function)
        except (KeyError, TypeError):
            return compiled(function)
        return made

    def leaf(function: Function) -> Function:
        """Compile a function that allocates nothing and is called by compiled ones only.

        It does not count references to the arrays that it is handed, which costs two atomic operations an array and
        call: two thirds of the time of a small circuit.
        The options are not documented; a numba without them compiles the slower code.
        """
        return _called(function, inlined=False)

    def part(function: Function) -> Function:
        """Compile a :func:`leaf` that is a part of its only caller: handing on tuples of arrays costs nothing then."""
        PARTS.add(function.__name__)
        return _called(function, inlined=True)
