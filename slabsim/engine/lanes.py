"""Eight points at once: a vector type for compiled code, one lane a point.

Products and solutions of small matrices are loops that the compiler does not vectorise over points by itself; with
the lanes written out it has no choice. A complex matrix element of eight points is two vectors, real and
imaginary part, beside each other in a flat float array. On processors with shorter vectors the compiler splits them.
"""

import operator
from collections.abc import Callable
from typing import Any

from llvmlite import ir
from numba import types
from numba.core import cgutils
from numba.extending import intrinsic, models, overload, register_model

from slabsim.engine.rows import LANES

_VECTOR = ir.VectorType(ir.DoubleType(), LANES)
_FAST = ("contract", "nsz", "arcp")


class Lanes(types.Type):
    """Type of eight float64 values."""

    def __init__(self) -> None:
        super().__init__(name="Lanes")


lanes = Lanes()


@register_model(Lanes)
class _LanesModel(models.PrimitiveModel):
    def __init__(self, manager: Any, kind: Any) -> None:
        super().__init__(manager, kind, _VECTOR)


def _pointer(context: Any, builder: Any, kind: Any, array: Any, index: Any) -> Any:
    data = context.make_array(kind)(context, builder, array).data
    return builder.bitcast(builder.gep(data, [index]), _VECTOR.as_pointer())


@intrinsic
def load(typingctx, array, index):
    """Eight values of a contiguous float array, from `index` on."""

    def codegen(context, builder, signature, args):
        value = builder.load(_pointer(context, builder, signature.args[0], args[0], args[1]))
        value.align = 8
        return value

    return lanes(array, types.intp), codegen


@intrinsic
def store(typingctx, array, index, value):
    """Put eight values into a contiguous float array, from `index` on."""

    def codegen(context, builder, signature, args):
        target = builder.store(args[2], _pointer(context, builder, signature.args[0], args[0], args[1]))
        target.align = 8
        return context.get_dummy_value()

    return types.void(array, types.intp, lanes), codegen


@intrinsic
def fill(typingctx, value):
    """The same value in every lane."""

    def codegen(context, builder, signature, args):
        nothing = ir.Constant(_VECTOR, ir.Undefined)
        first = builder.insert_element(nothing, args[0], ir.Constant(ir.IntType(32), 0))
        return builder.shuffle_vector(first, nothing, ir.Constant(ir.VectorType(ir.IntType(32), LANES), [0] * LANES))

    return lanes(types.float64), codegen


@intrinsic
def fma(typingctx, a, b, c):
    """a b + c, rounded once."""

    def codegen(context, builder, signature, args):
        kind = ir.FunctionType(_VECTOR, [_VECTOR] * 3)
        return builder.call(cgutils.get_or_insert_function(builder.module, kind, "llvm.fma.v8f64"), args)

    return lanes(lanes, lanes, lanes), codegen


@intrinsic
def where_positive(typingctx, condition, a, b):
    """a in the lanes where `condition` > 0, else b."""

    def codegen(context, builder, signature, args):
        zero = ir.Constant(_VECTOR, [0.0] * LANES)
        return builder.select(builder.fcmp_ordered(">", args[0], zero), args[1], args[2])

    return lanes(lanes, lanes, lanes), codegen


def _operation(name: str) -> Callable[..., Any]:
    @intrinsic
    def operation(typingctx, a, b):
        def codegen(context, builder, signature, args):
            return getattr(builder, name)(args[0], args[1], flags=_FAST)

        return lanes(lanes, lanes), codegen

    return operation


def _overload(symbol: Callable[..., Any], operation: Callable[..., Any]) -> None:
    @overload(symbol)
    def choose(a, b):
        if isinstance(a, Lanes) and isinstance(b, Lanes):
            return lambda a, b: operation(a, b)
        return None


add, subtract, times, divided = (_operation(name) for name in ("fadd", "fsub", "fmul", "fdiv"))
_overload(operator.add, add)
_overload(operator.sub, subtract)
_overload(operator.mul, times)
_overload(operator.truediv, divided)
