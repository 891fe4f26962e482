"""Codec: outcomes to bytes and back, bit for bit, for other processes and for the remembered answers.

The bytes are MessagePack: numbers, texts, lists and maps. Nothing in them is ever executed; only the
classes of `CLASSES` are made from them. Hessians are left out: a collection holds none.
"""

from __future__ import annotations

import struct
from collections.abc import Mapping, Sequence
from dataclasses import fields, is_dataclass
from typing import Any

import msgspec
import numpy as np

from thermo_pp import records
from thermo_pp.collect.outcome import Outcome
from thermo_pp.errors import Finding, ReadError
from thermo_pp.records import Calculation
from thermo_pp.sources import Damaged, Oversize

CLASSES: tuple[type, ...] = (
    Outcome,
    Finding,
    *(
        kind
        for _, kind in sorted(vars(records).items())
        if isinstance(kind, type) and is_dataclass(kind) and kind is not Finding
    ),
)
_ERRORS = (ReadError, Damaged, Oversize)
_NUMBER = {kind: place for place, kind in enumerate(CLASSES)}
_FIELDS = {kind: tuple(field.name for field in fields(kind)) for kind in CLASSES}
_HESSIAN = _FIELDS[Calculation].index("hessian_hartree_bohr2")
_ARRAY = 1
_DTYPES = ("<f8", "<i8", "|b1", "<f4", "<i4")
_PLAIN = frozenset((float, int, bool, type(None)))
_AS_IT_IS = _PLAIN | {str, np.ndarray}


class CodecError(ValueError):
    """Bytes that are no outcomes."""


def encode(outcomes: Sequence[Outcome]) -> bytes:
    """Return outcomes as bytes, without Hessians.

    Raises
    ------
    TypeError
        A record with a field of a type that is not known here.
    """
    return msgspec.msgpack.encode(_out(tuple(outcomes)))


def decode(data: bytes) -> tuple[Outcome, ...]:
    """Return outcomes from bytes.

    Raises
    ------
    CodecError
        Bytes that are no outcomes.
    """
    try:
        found = _in(_DECODER.decode(data))
    except (msgspec.MsgspecError, ValueError, TypeError, LookupError, AttributeError) as error:
        raise CodecError(str(error)) from error
    if not isinstance(found, tuple) or not all(isinstance(each, Outcome) for each in found):
        raise CodecError("no outcomes")
    return found


def pack(value: Any) -> bytes:
    """Return plain values (numbers, texts, bytes, lists, maps of texts) as bytes."""
    return msgspec.msgpack.encode(value)


def unpack(data: bytes) -> Any:
    """Return plain values from bytes; CodecError where they are none."""
    try:
        return msgspec.msgpack.decode(data)
    except (msgspec.MsgspecError, ValueError) as error:
        raise CodecError(str(error)) from error


def text(value: str) -> bytes:
    """Return a text, a path with bytes that are no UTF-8 too, as bytes."""
    return value.encode("utf-8", "surrogatepass")


def _text(value: str) -> str | bytes:
    """Return a text as MessagePack has it: as it is, or as bytes where it may be no UTF-8."""
    return value if value.isascii() else text(value)


def _out(value: Any) -> Any:
    """Return a value as what MessagePack has: classes as maps with whole numbers as keys."""
    kind = type(value)
    if kind in _PLAIN:
        return value
    if kind is str:
        return _text(value)
    if kind is tuple or kind is list:
        return [each if type(each) in _PLAIN else _out(each) for each in value]
    if kind in _NUMBER:
        parts = [getattr(value, name) for name in _FIELDS[kind]]
        if kind is Calculation:
            parts[_HESSIAN] = None
        return {
            0: _NUMBER[kind],
            1: [each if type(each) in _PLAIN else _out(each) for each in parts],
        }
    if kind is np.ndarray:
        return _array_out(value)
    if isinstance(value, Mapping):
        return {
            _text(key): each if type(each) in _PLAIN else _out(each) for key, each in value.items()
        }
    if kind in _ERRORS:
        return {
            0: -1 - _ERRORS.index(kind),
            1: [_text(part) for part in (value.what, value.where, value.mend)],
        }
    if isinstance(value, (np.generic,)):
        return _out(value.item())
    if isinstance(value, str):
        return _text(str(value))
    raise TypeError(f"{kind.__name__} cannot be remembered")


def _array_out(array: np.ndarray[Any, Any]) -> msgspec.msgpack.Ext:
    plain = np.ascontiguousarray(array)
    dtype = plain.dtype.newbyteorder("<").str
    if dtype not in _DTYPES:
        raise TypeError(f"an array of {array.dtype} cannot be remembered")
    header = struct.pack(f"<BB{array.ndim}q", _DTYPES.index(dtype), array.ndim, *array.shape)
    return msgspec.msgpack.Ext(_ARRAY, header + plain.astype(dtype, copy=False).tobytes())


def _array_in(code: int, data: memoryview) -> np.ndarray[Any, Any]:
    if code != _ARRAY:
        raise ValueError(f"no value is written with code {code}")
    start = 2 + 8 * data[1]
    shape = struct.unpack(f"<{data[1]}q", data[2:start])
    return np.frombuffer(bytes(data[start:]), dtype=_DTYPES[data[0]]).reshape(shape)


_DECODER = msgspec.msgpack.Decoder(ext_hook=_array_in)


def _in(value: Any) -> Any:
    """Return what `_out` made a value of; most values are as they are, and no call is made for them."""
    kind = type(value)
    if kind in _AS_IT_IS:
        return value
    if kind is list:
        return tuple([each if type(each) in _AS_IT_IS else _in(each) for each in value])
    if kind is bytes:
        return value.decode("utf-8", "surrogatepass")
    if kind is not dict:
        return value
    if 0 not in value:
        return {
            key if type(key) is str else _in(key): each if type(each) in _AS_IT_IS else _in(each)
            for key, each in value.items()
        }
    number = value[0]
    parts = [each if type(each) in _AS_IT_IS else _in(each) for each in value[1]]
    if number < 0:
        what, where, mend = parts
        return _ERRORS[-1 - number](what, where=where, mend=mend)
    made = CLASSES[number]
    if len(parts) != len(_FIELDS[made]):
        raise ValueError(f"{made.__name__} with {len(parts)} fields")
    return made(*parts)
