"""Makes the kernel's machine code with numba: one function of the C kind for each entry.

An entry gets one table of whole numbers, see :func:`.machine_code.flattened`, and hands the arrays on as its function
wants them.
"""

# mypy: disable-error-code="no-untyped-call,untyped-decorator,attr-defined"
from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any
from unittest.mock import patch

import numpy as np
from numba import typeof, types
from numba.core import cgutils
from numba.core.codegen import CPUCodeLibrary, JITCodeLibrary, JITCPUCodegen
from numba.core.compiler import DefaultPassBuilder
from numba.core.compiler_machinery import PassManager
from numba.core.types.functions import Function
from numba.extending import intrinsic

from . import layout
from .compiled import PARTS, leaf
from .elimination import Pattern
from .linearised import look
from .machine_code import flattened, packed
from .march import march_rows
from .vectors import WIDTH
from .work import work_for

_NEEDLESS = frozenset(
    {
        *("WithLifting", "InlineClosureLikes", "MakeFunctionToJitFunction", "RewriteDynamicRaises"),
        *("RewriteSemanticConstants", "GenericRewrites", "NopythonRewrites", "DeadBranchPrune"),
        *("InlineInlinables", "InlineOverloads", "FindLiterallyCalls", "LiteralUnroll"),
        *("LiteralPropagationSubPipelinePass", "NoPythonSupportedFeatureValidation", "AnnotateTypes"),
    }
)
"""Passes of the compiler that find nothing in the kernel, which has no closures, exceptions or expressions of whole
arrays: without them the code is the same, byte for byte."""
_TABLE = types.CPointer(types.int64)
_ALONE = ("entry", march_rows.__name__, look.__name__)


def compiled_code() -> bytes:
    """Compile all entries, which takes some 15 s."""
    made = []
    with _linked_only():
        for name, function, sample in _entries():
            entry = _entry(function, typeof(sample))
            entry.compile((_TABLE,))
            (overload,) = entry.overloads.values()
            library = overload.library
            _optimise(library, 2)
            code = library._codegen._tm.emit_object(library._final_module)
            made.append((name, flattened(sample)[1], overload.fndesc.llvm_func_name, code))
    return packed(made)


@contextmanager
def _linked_only() -> Iterator[None]:
    """Have functions linked into those that call them, but no machine code made of each; optimise them but lightly
    until they are all in their entry; and look for nothing that is not there, nor twice for the same: together more
    than half of the time.
    """
    with (
        patch.object(DefaultPassBuilder, "define_nopython_pipeline", staticmethod(_needed)),
        patch.object(Function, "get_call_type", _remembered(Function.get_call_type)),
        patch.object(CPUCodeLibrary, "_optimize_functions", _lay_out),
        patch.object(CPUCodeLibrary, "_optimize_final_module", _optimise_lightly),
        patch.object(JITCPUCodegen, "_add_module", lambda codegen, module: None),
        patch.object(JITCodeLibrary, "_finalize_specific", lambda library: None),
        patch.object(JITCPUCodegen, "set_env", lambda codegen, name, environment: None),
    ):
        yield


def _remembered(found: Callable[..., Any]) -> Callable[..., Any]:
    """What an operator makes of arguments of some kinds, looked for once: each time anew is a tenth of the time."""
    known: dict[Any, Any] = {}

    def call_type(function: Any, context: Any, args: Any, kws: Any) -> Any:
        asked = function, args, tuple(kws.items())
        if asked not in known:
            known[asked] = found(function, context, args, kws)
        return known[asked]

    return call_type


_all_passes = DefaultPassBuilder.define_nopython_pipeline


def _needed(state: Any, name: str = "nopython") -> PassManager:
    manager = PassManager(name)
    manager.passes = [each for each in _all_passes(state, name).passes if each[0].__name__ not in _NEEDLESS]
    manager.finalize()
    return manager


def _lay_out(library: Any, module: Any) -> None:
    module.data_layout = library._codegen._data_layout


def _optimise_lightly(library: Any) -> None:
    """What is one with its entry is optimised with it only."""
    function = library.name.partition("(")[0].partition("[")[0].rpartition(".")[2]
    if function not in _ALONE and function not in PARTS:
        _optimise(library, 1)


def _optimise(library: Any, level: int) -> None:
    """Optimise what is in a library; loops are not made vectors, since the kernel's numbers are vectors already."""
    manager, builder = library._codegen._module_pass_manager(opt=level, loop_vectorize=False, slp_vectorize=False)
    manager.run(library._final_module, builder)


def _entry(function: Callable[..., None], kind: Any) -> Any:
    unpacked = _unpacker(kind)

    def entry(table):  # type: ignore[no-untyped-def]
        function(*unpacked(table))

    return leaf(entry)


def _unpacker(kind: Any) -> Any:
    """A compiled function that makes a tuple of type ``kind`` of a table of addresses, shapes and numbers."""

    @intrinsic
    def unpacked(context, table):  # type: ignore[no-untyped-def]
        def generate(context, builder, signature, given):  # type: ignore[no-untyped-def]
            place = 0

            def number():  # type: ignore[no-untyped-def]
                nonlocal place
                address = cgutils.gep_inbounds(builder, given[0], place)
                place += 1
                return builder.load(address)

            def value(of):  # type: ignore[no-untyped-def]
                if isinstance(of, types.BaseTuple):
                    return context.make_tuple(builder, of, [value(one) for one in of.types])
                if not isinstance(of, types.Array):
                    return number()
                data = context.get_data_type(of.dtype).as_pointer()
                size = context.get_abi_sizeof(context.get_data_type(of.dtype))
                address = builder.inttoptr(number(), data)
                shape = [number() for _ in range(of.ndim)]
                strides: list[Any] = []
                span = context.get_constant(types.intp, size)
                for length in reversed(shape):
                    strides.insert(0, span)
                    span = builder.mul(span, length)
                array = context.make_array(of)(context, builder)
                context.populate_array(array, data=address, shape=shape, strides=strides, itemsize=size, meminfo=None)
                return array._getvalue()

            return value(kind)

        return kind(_TABLE), generate

    return unpacked


def _entries() -> list[tuple[str, Callable[..., None], tuple[Any, ...]]]:
    """Every entry with its function and arguments such as it gets: those of one conductance."""
    plan = Pattern(1)
    plan.couple((0,))
    lists = plan.plan()
    row = [0, 1, 0, 0, 0, lists.slot(0, 0), 1, 1, 1, *[0] * 5]
    top = layout.Topology(
        layout.ints([1, 1, 2, 1, 0]),
        layout.places([row], 1, layout.ELEMENT_WIDTH),
        layout.places([0, *[1] * layout.FAMILIES]),
        **lists.lists(),
    )
    program = layout.Program(
        np.full((1, 1), 1e-6),
        layout.ints([1]),
        np.zeros((1, 1, 1, 2)),
        np.zeros((1, 1, 3)),
        layout.ints([]),
        np.zeros((1, 1, 0, 2)),
    )
    rows = layout.Rows(
        term=layout.places([], 0, 4),
        factor=np.zeros(0),
        signal=layout.places([0]),
        row=layout.ints([], 0, 7),
        lasting=layout.ints([]),
        level=np.zeros(0),
        offset=np.zeros((0, 2)),
        stop_row=layout.ints([-1]),
        keep_row=layout.ints([]),
    )
    control = layout.Control(np.full(1, 1e-3), np.full(1, 1e-4), layout.ints([1000, 12, 200, 100_000, 1000]))
    results = layout.Results(
        np.zeros((1, 0)),
        np.zeros((1, 0)),
        np.zeros((1, 0), dtype=np.int64),
        np.zeros((1, 2), dtype=np.int64),
        np.zeros(1),
        np.zeros((1, 4), dtype=np.int64),
        np.zeros((1, 2)),
        np.zeros((1, 0, 2)),
        np.zeros((1, 0)),
        np.zeros((1, 0)),
        np.zeros((1, 0, 2)),
        layout.ints([0]),
    )
    lane, numbers = np.ones((1, 1)), np.zeros((1, WIDTH))
    work, _ = work_for(top, 1, 1, rows)
    cancel = np.zeros(1, dtype=np.uint8)
    marching = (top, lane, np.zeros((1, 2)), program, rows, control, results, work, 0, 1, cancel)
    looking = (top.element, top.group, *[numbers] * 5, 0, *[numbers] * 8)
    return [("march", march_rows, marching), ("look", look, looking)]
