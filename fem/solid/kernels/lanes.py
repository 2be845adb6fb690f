"""A few neighbouring entries of an array as one value of the processor's vector registers.

The compiler of the kernels turns loops over a fixed few columns into single operations only; with these it gets
vector instructions, whatever the processor's width. For use inside kernels; places are unsigned, as everywhere there.
"""

from __future__ import annotations

from typing import Any

from llvmlite import ir  # type: ignore[import-untyped]
from numba.core import types
from numba.core.datamodel import models
from numba.extending import intrinsic, register_model

_LANE = ir.IntType(32)


class Lanes(types.Type):
    """`width` floating-point numbers."""

    def __init__(self, element: types.Float, width: int) -> None:
        self.element, self.width = element, width
        super().__init__(name=f"Lanes({element}, {width})")


@register_model(Lanes)
class _LanesModel(models.PrimitiveModel):
    def __init__(self, manager: Any, lanes: Lanes) -> None:
        super().__init__(manager, lanes, ir.VectorType(manager.lookup(lanes.element).get_value_type(), lanes.width))


def _place(context: Any, builder: Any, kind: types.Array, array: Any, index: Any, vector: ir.VectorType) -> Any:
    data = context.make_array(kind)(context, builder, array).data
    return builder.bitcast(builder.gep(data, [index]), ir.PointerType(vector))


@intrinsic(prefer_literal=True)
def load(typing: Any, array: Any, first: Any, width: Any) -> Any:
    """Entries first, ..., first + width - 1 of a flat contiguous array; `width` is a constant."""
    lanes = Lanes(array.dtype, width.literal_value)

    def build(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        place = _place(context, builder, signature.args[0], args[0], args[1], context.get_value_type(lanes))
        value = builder.load(place)
        value.align = array.dtype.bitwidth // 8
        return value

    return lanes(array, types.uint64, width), build


@intrinsic(prefer_literal=True)
def store(typing: Any, array: Any, first: Any, lanes: Any) -> Any:
    """Write them back."""

    def build(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        written = builder.store(args[2], _place(context, builder, signature.args[0], args[0], args[1], args[2].type))
        written.align = array.dtype.bitwidth // 8
        return context.get_dummy_value()

    return types.none(array, types.uint64, lanes), build


@intrinsic(prefer_literal=True)
def times(typing: Any, factor: Any, lanes: Any) -> Any:
    """factor lanes."""

    def build(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.fmul(_everywhere(builder, args[0], args[1].type), args[1])

    return lanes(lanes.element, lanes), build


@intrinsic(prefer_literal=True)
def times_plus(typing: Any, factor: Any, lanes: Any, more: Any) -> Any:
    """factor lanes + more, in one operation where there is one."""

    def build(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        product = builder.fmul(_everywhere(builder, args[0], args[1].type), args[1], flags=("contract",))
        return builder.fadd(product, args[2], flags=("contract",))

    return lanes(lanes.element, lanes, lanes), build


@intrinsic(prefer_literal=True)
def plus(typing: Any, lanes: Any, more: Any) -> Any:
    """lanes + more."""

    def build(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.fadd(args[0], args[1])

    return lanes(lanes, lanes), build


@intrinsic(prefer_literal=True)
def product(typing: Any, lanes: Any, more: Any) -> Any:
    """lanes more, entry by entry."""

    def build(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.fmul(args[0], args[1])

    return lanes(lanes, lanes), build


@intrinsic(prefer_literal=True)
def minus(typing: Any, lanes: Any, less: Any) -> Any:
    """lanes - less."""

    def build(context: Any, builder: Any, signature: Any, args: Any) -> Any:
        return builder.fsub(args[0], args[1])

    return lanes(lanes, lanes), build


def _everywhere(builder: Any, value: Any, vector: ir.VectorType) -> Any:
    nothing = ir.Constant(vector, ir.Undefined)
    one = builder.insert_element(nothing, value, ir.Constant(_LANE, 0))
    return builder.shuffle_vector(one, nothing, ir.Constant(ir.VectorType(_LANE, vector.count), [0] * vector.count))
