"""Scaled numbers: a mantissa and a power of two for each entry, so that nothing over- or underflows.

Effective rates of a mechanism span hundreds of orders of magnitude. Only additions, products and
quotients of numbers of one sign are needed; each costs one rounding, whatever the size.

The first axis is the batch (temperatures, samples). Where it is the longest it is contiguous in
memory, so that each step of an elimination is one pass over contiguous numbers.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
_LN2 = np.log(np.longdouble(2.0))
_ZERO_EXPONENT = -(2**26)
"""Exponent of a zero: below that of any number, so that it never sets the scale of a sum."""


def zeros(shape: tuple[int, ...]) -> FloatArray:
    """Return zeros, the first axis contiguous where it is longer than the last."""
    return np.zeros(shape, order="F" if shape[0] > shape[-1] else "C")


class Scaled:
    """An array of numbers mantissa * 2**exponent, mantissa in [0.5, 1) or 0.

    Parameters
    ----------
    mantissa : shape (...)
    exponent : shape (...), int32
    """

    __slots__ = ("exponent", "mantissa")

    def __init__(self, mantissa: FloatArray, exponent: NDArray[np.int32]) -> None:
        self.mantissa = mantissa
        self.exponent = exponent

    @classmethod
    def normalised(cls, mantissa: FloatArray, exponent: NDArray[np.int32]) -> Scaled:
        """Return mantissa * 2**exponent with the mantissa brought back into [0.5, 1)."""
        fraction, shift = np.frexp(mantissa)
        shift += exponent
        shift[fraction == 0.0] = _ZERO_EXPONENT
        return cls(fraction, shift)

    @classmethod
    def from_float(cls, values: Any) -> Scaled:
        """Return ordinary numbers as scaled ones."""
        array = np.asarray(values, dtype=np.float64)
        return cls.normalised(array, np.zeros(array.shape, np.int32))

    @classmethod
    def from_log(cls, logarithm: NDArray[np.floating[Any]]) -> Scaled:
        """Return exp(logarithm); -inf gives 0. A logarithm of extended precision keeps it."""
        extended = np.asarray(logarithm, dtype=np.longdouble)
        known = np.isfinite(extended)
        safe = np.where(known, extended, 0.0)
        exponent = np.floor(safe / _LN2)
        rest = np.asarray(safe - exponent * _LN2, dtype=np.float64)
        return cls.normalised(np.where(known, np.exp(rest), 0.0), exponent.astype(np.int32))

    @classmethod
    def zeros(cls, shape: tuple[int, ...]) -> Scaled:
        """Return an array of zeros."""
        mantissa = zeros(shape)
        return cls(mantissa, np.full_like(mantissa, _ZERO_EXPONENT, np.int32))

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the array."""
        return self.mantissa.shape

    def __getitem__(self, key: Any) -> Scaled:
        return Scaled(self.mantissa[key], self.exponent[key])

    def __setitem__(self, key: Any, value: Scaled) -> None:
        self.mantissa[key] = value.mantissa
        self.exponent[key] = value.exponent

    def __mul__(self, other: Scaled) -> Scaled:
        return Scaled.normalised(self.mantissa * other.mantissa, self.exponent + other.exponent)

    def __truediv__(self, other: Scaled) -> Scaled:
        return Scaled.normalised(self.mantissa / other.mantissa, self.exponent - other.exponent)

    def __add__(self, other: Scaled) -> Scaled:
        top = np.maximum(self.exponent, other.exponent)
        return Scaled.normalised(
            np.ldexp(self.mantissa, self.exponent - top)
            + np.ldexp(other.mantissa, other.exponent - top),
            top,
        )

    def sum(self, axis: int) -> Scaled:
        """Return the sum over one axis."""
        top = self.exponent.max(axis=axis, keepdims=True)
        total = np.ldexp(self.mantissa, self.exponent - top).sum(axis=axis)
        return Scaled.normalised(total, np.squeeze(top, axis=axis))

    def signed(self, sign: FloatArray) -> Scaled:
        """Return the numbers times 1, -1 or 0."""
        return Scaled(self.mantissa * sign, self.exponent)

    def levelled(self) -> tuple[FloatArray, NDArray[np.int32]]:
        """Return matrices (b, n, n) over 2**power with their largest row sums in [0.5, 1), and power (b,)."""
        top = self.sum(axis=2).exponent.max(axis=1)
        return np.ldexp(self.mantissa, self.exponent - top[:, np.newaxis, np.newaxis]), top

    def copy(self) -> Scaled:
        """Return an array that can be changed without changing this one."""
        return Scaled(self.mantissa.copy(), self.exponent.copy())

    def to_float(self) -> FloatArray:
        """Return ordinary numbers; what is too large becomes inf, what is too small 0."""
        with np.errstate(over="ignore", under="ignore"):
            return np.asarray(np.ldexp(self.mantissa, self.exponent))

    def log(self) -> FloatArray:
        """Return the natural logarithm; -inf for 0."""
        with np.errstate(divide="ignore"):
            logarithm = np.log(self.mantissa) + self.exponent * float(_LN2)
        return np.where(self.mantissa == 0.0, -np.inf, logarithm)


class Ordinary(Scaled):
    """The same with ordinary numbers: several times faster, for batches.

    What leaves their range is no answer but a FloatingPointError; the batch is worked out again with scaled
    numbers then. `mantissa` is the number, `exponent` is not used.
    """

    __slots__ = ()

    def __init__(self, mantissa: FloatArray) -> None:
        super().__init__(mantissa, _NO_EXPONENT)

    @classmethod
    def from_float(cls, values: Any) -> Ordinary:
        """Return an array of numbers."""
        return cls(np.asarray(values, dtype=np.float64))

    @classmethod
    def from_log(cls, logarithm: NDArray[np.floating[Any]]) -> Ordinary:
        """Return exp(logarithm); -inf gives 0."""
        with np.errstate(under="raise", over="raise"):
            return cls(np.exp(np.asarray(logarithm, dtype=np.float64)))

    @classmethod
    def zeros(cls, shape: tuple[int, ...]) -> Ordinary:
        """Return an array of zeros."""
        return cls(zeros(shape))

    def __getitem__(self, key: Any) -> Ordinary:
        return Ordinary(self.mantissa[key])

    def __setitem__(self, key: Any, value: Scaled) -> None:
        self.mantissa[key] = value.mantissa

    def __mul__(self, other: Scaled) -> Ordinary:
        with np.errstate(under="raise", over="raise"):
            return Ordinary(self.mantissa * other.mantissa)

    def __truediv__(self, other: Scaled) -> Ordinary:
        with np.errstate(under="raise", over="raise", divide="raise"):
            return Ordinary(self.mantissa / other.mantissa)

    def __add__(self, other: Scaled) -> Ordinary:
        return Ordinary(self.mantissa + other.mantissa)

    def sum(self, axis: int) -> Ordinary:
        """Return the sum over one axis."""
        return Ordinary(self.mantissa.sum(axis=axis))

    def signed(self, sign: FloatArray) -> Ordinary:
        """Return the numbers times 1, -1 or 0."""
        return Ordinary(self.mantissa * sign)

    def levelled(self) -> tuple[FloatArray, NDArray[np.int32]]:
        """Return matrices (b, n, n) over 2**power with their largest row sums in [0.5, 1), and power (b,)."""
        top = np.frexp(self.mantissa.sum(axis=2).max(axis=1))[1]
        return np.ldexp(self.mantissa, -top[:, np.newaxis, np.newaxis]), top

    def copy(self) -> Ordinary:
        """Return an array that can be changed without changing this one."""
        return Ordinary(self.mantissa.copy())

    def to_float(self) -> FloatArray:
        """Return the numbers."""
        return self.mantissa

    def log(self) -> FloatArray:
        """Return the natural logarithm; -inf for 0."""
        with np.errstate(divide="ignore"):
            return np.asarray(np.log(self.mantissa))


_NO_EXPONENT = np.zeros(0, np.int32)


def fraction(part: Scaled, whole: Scaled) -> FloatArray:
    """Return part/whole as ordinary numbers, 0 where both are 0."""
    nothing = whole.mantissa == 0.0
    with np.errstate(divide="ignore", invalid="ignore", over="ignore", under="ignore"):
        ratio = part.mantissa / whole.mantissa
        if nothing.any():
            ratio = np.where(nothing, 0.0, ratio)
        if isinstance(part, Ordinary):
            return np.asarray(ratio)
        return np.asarray(np.ldexp(ratio, part.exponent - whole.exponent))
