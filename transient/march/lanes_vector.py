"""Sixteen numbers at once: a vector type for compiled code.

A plain loop over the lanes of arrays that might overlap is not turned into vector instructions by the compiler.  Here
a row of ``WIDTH`` numbers is one value that is loaded, computed with and stored, and a recursion over nodes keeps it
in registers.  How many instructions that takes is left to the machine (two with 512 bits, eight with 128).
"""

from __future__ import annotations

import operator
from typing import Any

from transient.compiled import numba

WIDTH = 16
HALF = WIDTH // 2

_ir = numba.core.cgutils.ir
_types = numba.core.types
_extending = numba.extending
_NUMBER = _ir.DoubleType()
_VECTOR = _ir.VectorType(_NUMBER, WIDTH)
_PLACE = _ir.IntType(32)


class Vector(_types.Type):
    """``WIDTH`` double numbers."""

    def __init__(self) -> None:
        super().__init__(name=f"Vector{WIDTH}")


vector = Vector()


@_extending.register_model(Vector)
class _VectorModel(_extending.models.PrimitiveModel):
    def __init__(self, manager: Any, kind: Any):
        super().__init__(manager, kind, _VECTOR)


def _row(context: Any, builder: Any, kind: Any, array: Any, row: Any) -> Any:
    """Pointer to a row of a C-contiguous array [rows, WIDTH]."""
    data = context.make_array(kind)(context, builder, array).data
    place = builder.mul(row, _ir.Constant(row.type, WIDTH))
    return builder.bitcast(builder.gep(data, [place]), _VECTOR.as_pointer())


def _is_lanes(array: Any) -> bool:
    return (
        isinstance(array, _types.Array) and array.ndim == 2 and array.layout == "C" and array.dtype == _types.float64
    )


@_extending.intrinsic
def load(typing: Any, array: Any, row: Any) -> Any:
    """Row ``row`` of ``array`` [rows, WIDTH]."""
    if not _is_lanes(array):
        return None

    def code(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.load(_row(context, builder, signature.args[0], *args), align=8)

    return vector(array, _types.intp), code


@_extending.intrinsic
def store(typing: Any, array: Any, row: Any, value: Any) -> Any:
    """Put ``value`` into row ``row`` of ``array`` [rows, WIDTH]."""
    if not _is_lanes(array):
        return None

    def code(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        builder.store(args[2], _row(context, builder, signature.args[0], *args[:2]), align=8)
        return context.get_dummy_value()

    return _types.void(array, _types.intp, vector), code


def _splatted(builder: Any, number: Any) -> Any:
    one = builder.insert_element(_ir.Constant(_VECTOR, _ir.Undefined), number, _ir.Constant(_PLACE, 0))
    zeros = _ir.Constant(_ir.VectorType(_PLACE, WIDTH), [0] * WIDTH)
    return builder.shuffle_vector(one, _ir.Constant(_VECTOR, _ir.Undefined), zeros)


def _known(builder: Any, name: str, args: Any) -> Any:
    """A function that the compiler's back end knows for vectors."""
    kind = _ir.FunctionType(_VECTOR, [_VECTOR] * len(args))
    known = numba.core.cgutils.get_or_insert_function(builder.module, kind, f"{name}.v{WIDTH}f64")
    return builder.call(known, args)


@_extending.intrinsic
def splat(typing: Any, number: Any) -> Any:
    """The same number in all places."""

    def code(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return _splatted(builder, args[0])

    return vector(_types.float64), code


@_extending.intrinsic
def swapped(typing: Any, value: Any) -> Any:
    """Lower and upper half of the places exchanged."""
    order = [*range(HALF, WIDTH), *range(HALF)]

    def code(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        turn = _ir.Constant(_ir.VectorType(_PLACE, WIDTH), order)
        return builder.shuffle_vector(args[0], args[0], turn)

    return vector(vector), code


@_extending.intrinsic
def fma(typing: Any, a: Any, b: Any, c: Any) -> Any:
    """a b + c, rounded once."""

    def code(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return _known(builder, "llvm.fma", args)

    return vector(vector, vector, vector), code


@_extending.intrinsic
def magnitude(typing: Any, value: Any) -> Any:
    """|value|."""

    def code(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return _known(builder, "llvm.fabs", args)

    return vector(vector), code


@_extending.intrinsic
def where_above(typing: Any, a: Any, b: Any, then: Any, otherwise: Any) -> Any:
    """``then`` where a > b, else ``otherwise``."""

    def code(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        above = builder.fcmp_ordered(">", args[0], args[1])
        return builder.select(above, args[2], args[3])

    return vector(vector, vector, vector, vector), code


def _binary(symbol: Any, name: str) -> None:
    @_extending.lower_builtin(symbol, vector, vector)
    def code(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return getattr(builder, name)(*args)

    @numba.core.typing.templates.infer_global(symbol)
    class Template(numba.core.typing.templates.ConcreteTemplate):
        cases = [numba.core.typing.signature(vector, vector, vector)]  # noqa: RUF012


_binary(operator.add, "fadd")
_binary(operator.sub, "fsub")
_binary(operator.mul, "fmul")
_binary(operator.truediv, "fdiv")
