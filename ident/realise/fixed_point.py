"""FixedPoint: the same coefficients as whole numbers of a word, and what rounding them costs."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ident.errors import Refused
from ident.realise.difference import Difference, Row
from ident.realise.digital import Digital


@dataclass(frozen=True, slots=True)
class Word:
    """integer 2^-shift stands for a coefficient; a negative shift multiplies."""

    name: str
    integer: int
    shift: int

    @property
    def value(self) -> float:
        return math.ldexp(self.integer, -self.shift)


@dataclass(frozen=True, slots=True)
class FixedPoint:
    """Coefficients in words of `bits` bits, sign included.

    words          num0.. act on the error, rest1.. on past moves of the command (velocity form): one common shift
    integral_step  on its own with its own shift: sum of num, which the common shift would round coarsely
    feedback       the controller that really runs
    """

    bits: int
    words: tuple[Word, ...]
    integral_step: Word
    feedback: Difference


def fixed_point(controller: Digital, *, bits: int = 16, scale: float = 1.0) -> FixedPoint:
    """Round a controller to whole numbers (16 bits: Q15 where the shift is 15).

    bits   8 to 32;  scale  gains are multiplied by it first: speed_span/command_span where both signals are
           fractions of their span
    The integral part, num at q = 1, is kept apart: num(q) = integral + (1 - q) other(q), each rounded.
    Raises Refused word-out-of-range.
    """
    if not 8 <= bits <= 32 or not 0.0 < scale < math.inf:
        raise Refused("word-out-of-range", f"Words have 8 to 32 bits and the scale is above 0; got {bits}, {scale}.")
    loop = controller.feedback
    total = float(np.sum(loop.num))
    other = -np.cumsum(np.array(loop.num[::-1]))[::-1][1:]  # (num - total)/(1 - q)
    parts = {f"num{i}": scale * v for i, v in enumerate(other)} | {
        f"rest{i}": v for i, v in enumerate(loop.rest[1:], start=1)
    }
    shift = common_shift(tuple(parts.values()), bits)
    words = tuple(_word(name, v, shift) for name, v in parts.items())
    own = _word("integral_step", scale * total, common_shift((scale * total,), bits))
    if own.integer == 0:
        raise Refused("word-out-of-range", "The integral step is lost in this word length: use more bits.")
    rounded = {w.name: w.value for w in words}
    num = np.zeros(max(len(loop.num), 1))
    num[0] = own.value / scale
    for i in range(len(other)):
        num[i] += rounded[f"num{i}"] / scale
        num[i + 1] -= rounded[f"num{i}"] / scale
    rest = (1.0, *(rounded[f"rest{i}"] for i in range(1, len(loop.rest))))
    return FixedPoint(bits, words, own, Difference(tuple(num.tolist()), rest, loop.h, loop.Ti, loop.Td, loop.Tf))


def common_shift(values: Row, bits: int) -> int:
    """The largest shift at which every value still fits a signed word."""
    largest = max((abs(v) for v in values), default=0.0)
    if largest == 0.0:
        return bits - 1
    shift = bits - 1 - math.frexp(largest)[1]
    return shift if round(math.ldexp(largest, shift)) < 2 ** (bits - 1) else shift - 1


def _word(name: str, value: float, shift: int) -> Word:
    return Word(name, round(math.ldexp(value, shift)), shift)
