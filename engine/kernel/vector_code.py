"""The compiled side of :mod:`.vectors`: eight lanes as one vector type of the compiler.

Loops over eight lanes in plain code are not made into vectors, because arrays might overlap; with a type of its own
nothing is left to guess. Where the processor has shorter vectors the compiler takes several.
"""

# mypy: disable-error-code="no-untyped-call"
from __future__ import annotations

import operator
from collections.abc import Callable
from typing import Any

from llvmlite import ir
from numba import types
from numba.core import cgutils
from numba.core.typing.templates import AbstractTemplate, infer_global, signature
from numba.extending import intrinsic, lower_builtin, models, register_model

from .machine_code import WIDTH

_DOUBLE = ir.DoubleType()
_WORD = ir.IntType(64)
_NUMBERS = ir.VectorType(_DOUBLE, WIDTH)
_WORDS = ir.VectorType(_WORD, WIDTH)
_FLAGS = ir.VectorType(ir.IntType(1), WIDTH)


class NumbersType(types.Type):
    """One float64 per lane."""

    def __init__(self) -> None:
        super().__init__(name="stagebook_numbers")


class FlagsType(types.Type):
    """One truth per lane."""

    def __init__(self) -> None:
        super().__init__(name="stagebook_flags")


NUMBERS = NumbersType()
FLAGS = FlagsType()


@register_model(NumbersType)
class _NumbersModel(models.PrimitiveModel):
    def __init__(self, manager: Any, of: Any) -> None:
        super().__init__(manager, of, _NUMBERS)


@register_model(FlagsType)
class _FlagsModel(models.PrimitiveModel):
    def __init__(self, manager: Any, of: Any) -> None:
        super().__init__(manager, of, _FLAGS)


def _all(value: float) -> ir.Constant:
    return ir.Constant(_NUMBERS, [value] * WIDTH)


def _words(value: int) -> ir.Constant:
    return ir.Constant(_WORDS, [value] * WIDTH)


def _vector(builder: Any, of: Any, value: Any) -> Any:
    """A number in all lanes; a vector as it is."""
    if of is NUMBERS:
        return value
    empty = ir.Constant(_NUMBERS, ir.Undefined)
    first = builder.insert_element(empty, value, ir.Constant(ir.IntType(32), 0))
    places = ir.Constant(ir.VectorType(ir.IntType(32), WIDTH), [0] * WIDTH)
    return builder.shuffle_vector(first, empty, places)


def _built_in(builder: Any, name: str, a: Any) -> Any:
    """Call one of the compiler's own functions on a vector."""
    full = f"llvm.{name}.v{WIDTH}f64"
    kind = ir.FunctionType(_NUMBERS, [_NUMBERS])
    return builder.call(cgutils.get_or_insert_function(builder.module, kind, full), [a])


def _operator(function: Any, result: Any, make: Callable[[Any, Any, Any], Any]) -> None:
    """Teach the compiler an operator on numbers of lanes, a single number on either side too."""

    class Typing(AbstractTemplate):
        def generic(self, args: Any, kws: Any) -> Any:
            known = all(a is NUMBERS or isinstance(a, (types.Float, types.Integer)) for a in args)
            if len(args) == 2 and NUMBERS in args and known:
                return signature(result, *(a if a is NUMBERS else types.float64 for a in args))
            return None

    infer_global(function)(Typing)

    def lower(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        a, b = (_vector(builder, of, value) for of, value in zip(sig.args, args, strict=True))
        return make(builder, a, b)

    for pair in ((NumbersType, NumbersType), (NumbersType, types.Float), (types.Float, NumbersType)):
        lower_builtin(function, *pair)(lower)


_operator(operator.add, NUMBERS, lambda builder, a, b: builder.fadd(a, b))
_operator(operator.sub, NUMBERS, lambda builder, a, b: builder.fsub(a, b))
_operator(operator.mul, NUMBERS, lambda builder, a, b: builder.fmul(a, b))
_operator(operator.truediv, NUMBERS, lambda builder, a, b: builder.fdiv(a, b))
_operator(operator.lt, FLAGS, lambda builder, a, b: builder.fcmp_ordered("<", a, b))
_operator(operator.le, FLAGS, lambda builder, a, b: builder.fcmp_ordered("<=", a, b))
_operator(operator.gt, FLAGS, lambda builder, a, b: builder.fcmp_ordered(">", a, b))
_operator(operator.ge, FLAGS, lambda builder, a, b: builder.fcmp_ordered(">=", a, b))
_operator(operator.eq, FLAGS, lambda builder, a, b: builder.fcmp_ordered("==", a, b))
_operator(operator.ne, FLAGS, lambda builder, a, b: builder.fcmp_unordered("!=", a, b))


def _flag_operator(function: Any, make: Callable[..., Any], count: int) -> None:
    class Typing(AbstractTemplate):
        def generic(self, args: Any, kws: Any) -> Any:
            return signature(FLAGS, *args) if len(args) == count and all(a is FLAGS for a in args) else None

    infer_global(function)(Typing)
    lower_builtin(function, *[FlagsType] * count)(lambda context, builder, sig, args: make(builder, *args))


_flag_operator(operator.and_, lambda builder, a, b: builder.and_(a, b), 2)
_flag_operator(operator.or_, lambda builder, a, b: builder.or_(a, b), 2)
_flag_operator(operator.invert, lambda builder, a: builder.not_(a), 1)


def _unary(function: Any, make: Callable[[Any, Any], Any]) -> None:
    class Typing(AbstractTemplate):
        def generic(self, args: Any, kws: Any) -> Any:
            return signature(NUMBERS, NUMBERS) if len(args) == 1 and args[0] is NUMBERS else None

    infer_global(function)(Typing)
    lower_builtin(function, NumbersType)(lambda context, builder, sig, args: make(builder, args[0]))


_unary(operator.neg, lambda builder, a: builder.fsub(_all(-0.0), a))
_unary(abs, lambda builder, a: _built_in(builder, "fabs", a))


def _row(context: Any, builder: Any, array: Any, given: Any, k: Any, kind: Any) -> Any:
    """Pointer to row k of an array (rows, WIDTH)."""
    data = context.make_array(array)(context, builder, given).data
    place = builder.zext(k, _WORD) if k.type.width < 64 else k
    first = builder.gep(data, [builder.mul(place, ir.Constant(_WORD, WIDTH))])
    return builder.bitcast(first, kind.as_pointer())


def _load(builder: Any, pointer: Any) -> Any:
    value = builder.load(pointer)
    value.align = 8
    return value


def _store(builder: Any, value: Any, pointer: Any) -> None:
    builder.store(value, pointer).align = 8


@intrinsic
def at(typing: Any, x: Any, k: Any) -> Any:
    """Row k of an array."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        return _load(builder, _row(context, builder, sig.args[0], args[0], args[1], _NUMBERS))

    return NUMBERS(x, k), code


@intrinsic
def put(typing: Any, x: Any, k: Any, v: Any) -> Any:
    """Set row k of an array."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        value = _vector(builder, sig.args[2], args[2])
        _store(builder, value, _row(context, builder, sig.args[0], args[0], args[1], _NUMBERS))
        return context.get_dummy_value()

    return types.void(x, k, v), code


@intrinsic
def add(typing: Any, x: Any, k: Any, v: Any) -> Any:
    """Add to row k of an array."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        row = _row(context, builder, sig.args[0], args[0], args[1], _NUMBERS)
        _store(builder, builder.fadd(_load(builder, row), _vector(builder, sig.args[2], args[2])), row)
        return context.get_dummy_value()

    return types.void(x, k, v), code


@intrinsic
def fused(typing: Any, a: Any, b: Any, c: Any) -> Any:
    """a b + c, rounded once where the processor can."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        values = [_vector(builder, of, value) for of, value in zip(sig.args, args, strict=True)]
        kind = ir.FunctionType(_NUMBERS, [_NUMBERS] * 3)
        known = cgutils.get_or_insert_function(builder.module, kind, f"llvm.fmuladd.v{WIDTH}f64")
        return builder.call(known, values)

    return NUMBERS(a, b, c), code


@intrinsic
def where(typing: Any, flags: Any, yes: Any, no: Any) -> Any:
    """Choose lane by lane."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        yes, no = (_vector(builder, of, value) for of, value in zip(sig.args[1:], args[1:], strict=True))
        return builder.select(args[0], yes, no)

    return NUMBERS(flags, yes, no), code


@intrinsic
def any_of(typing: Any, flags: Any) -> Any:
    """Whether any lane is flagged."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        bits = builder.bitcast(args[0], ir.IntType(WIDTH))
        return builder.icmp_unsigned("!=", bits, ir.Constant(ir.IntType(WIDTH), 0))

    return types.boolean(flags), code


@intrinsic
def same(typing: Any, x: Any, value: Any) -> Any:
    """Flags the lanes in which whole numbers have a value."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        row = _load(builder, _row(context, builder, sig.args[0], args[0], ir.Constant(_WORD, 0), _WORDS))
        value = context.cast(builder, args[1], sig.args[1], types.int64)
        empty = ir.Constant(_WORDS, ir.Undefined)
        first = builder.insert_element(empty, value, ir.Constant(ir.IntType(32), 0))
        places = ir.Constant(ir.VectorType(ir.IntType(32), WIDTH), [0] * WIDTH)
        return builder.icmp_signed("==", row, builder.shuffle_vector(first, empty, places))

    return FLAGS(x, value), code


@intrinsic
def flag(typing: Any, flags: Any, x: Any) -> Any:
    """Write flags to whole numbers."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        row = _row(context, builder, sig.args[1], args[1], ir.Constant(_WORD, 0), _WORDS)
        _store(builder, builder.zext(args[0], _WORDS), row)
        return context.get_dummy_value()

    return types.void(flags, x), code


def _chosen(sign: str) -> Callable[..., Any]:
    def build(typing: Any, a: Any, b: Any) -> Any:
        def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
            first, second = (_vector(builder, of, value) for of, value in zip(sig.args, args, strict=True))
            return builder.select(builder.fcmp_ordered(sign, first, second), first, second)

        return NUMBERS(a, b), code

    return build


lesser = intrinsic(_chosen("<"))
greater = intrinsic(_chosen(">"))


@intrinsic
def root(typing: Any, a: Any) -> Any:
    """Square root, rounded correctly."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        return _built_in(builder, "sqrt", args[0])

    return NUMBERS(a), code


@intrinsic
def scaled_by_power(typing: Any, a: Any, shifted: Any) -> Any:
    """a times two to the power that stands in the last bits of ``shifted``."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        power = builder.shl(builder.bitcast(args[1], _WORDS), _words(52))
        return builder.bitcast(builder.add(builder.bitcast(args[0], _WORDS), power), _NUMBERS)

    return NUMBERS(a, shifted), code


@intrinsic
def split_power(typing: Any, a: Any) -> Any:
    """a as m times two to the power e, m between the roots of a half and of two."""

    def code(context: Any, builder: Any, sig: Any, args: Any) -> Any:
        bits = builder.bitcast(args[0], _WORDS)
        e = builder.ashr(builder.sub(bits, _words(0x3FE6A09E667F3BCD)), _words(52))
        m = builder.bitcast(builder.sub(bits, builder.shl(e, _words(52))), _NUMBERS)
        shifted = builder.bitcast(builder.add(e, _words(0x4338000000000000)), _NUMBERS)
        pair = ir.Constant(ir.ArrayType(_NUMBERS, 2), ir.Undefined)
        pair = builder.insert_value(pair, m, 0)
        return builder.insert_value(pair, builder.fsub(shifted, _all(6755399441055744.0)), 1)

    return types.UniTuple(NUMBERS, 2)(a), code
