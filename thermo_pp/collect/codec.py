"""Codec: outcomes to bytes and back, bit for bit, for other processes and for the remembered answers.

The bytes are MessagePack: numbers, texts, lists and maps. Nothing in them is ever executed; only the
classes of `CLASSES` are made from them. Hessians are left out: a collection holds none.
"""

from __future__ import annotations

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
_LEFT_OUT = {(Calculation, "hessian_hartree_bohr2")}
_ARRAY = 1
_DTYPES = ("<f8", "<i8", "|b1", "<f4", "<i4")
_PLAIN = frozenset((float, int, bool, type(None)))
_AS_IT_IS = _PLAIN | {np.ndarray}


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


def _out(value: Any) -> Any:
    """Return a value as what MessagePack has: texts as bytes, classes as maps with whole numbers as keys."""
    kind = type(value)
    if kind is str:
        return value.encode("utf-8", "surrogatepass")
    if kind in _PLAIN:
        return value
    if kind is tuple or kind is list:
        return [_out(each) for each in value]
    if kind in _NUMBER:
        parts = [
            None if (kind, name) in _LEFT_OUT else _out(getattr(value, name))
            for name in _FIELDS[kind]
        ]
        return {0: _NUMBER[kind], 1: parts}
    if kind is np.ndarray:
        return _array_out(value)
    if isinstance(value, Mapping):
        return {text(key): _out(each) for key, each in value.items()}
    if kind in _ERRORS:
        return {
            0: -1 - _ERRORS.index(kind),
            1: [text(part) for part in (value.what, value.where, value.mend)],
        }
    if isinstance(value, (np.generic,)):
        return _out(value.item())
    if isinstance(value, str):
        return text(str(value))
    raise TypeError(f"{kind.__name__} cannot be remembered")


def _array_out(array: np.ndarray[Any, Any]) -> msgspec.msgpack.Ext:
    plain = np.ascontiguousarray(array)
    dtype = plain.dtype.newbyteorder("<").str
    if dtype not in _DTYPES:
        raise TypeError(f"an array of {array.dtype} cannot be remembered")
    header = bytes((_DTYPES.index(dtype), array.ndim))
    shape = np.array(array.shape, dtype="<i8").tobytes()
    return msgspec.msgpack.Ext(_ARRAY, header + shape + plain.astype(dtype, copy=False).tobytes())


def _array_in(code: int, data: memoryview) -> np.ndarray[Any, Any]:
    if code != _ARRAY:
        raise ValueError(f"no value is written with code {code}")
    start = 2 + 8 * data[1]
    shape = np.frombuffer(bytes(data[2:start]), dtype="<i8")
    return np.frombuffer(bytes(data[start:]), dtype=_DTYPES[data[0]]).reshape(shape)


_DECODER = msgspec.msgpack.Decoder(ext_hook=_array_in)


def _in(value: Any) -> Any:
    kind = type(value)
    if kind is bytes:
        return value.decode("utf-8", "surrogatepass")
    if kind in _AS_IT_IS:  # most values: not asked about one kind after the other
        return value
    if kind is list:
        return tuple([_in(each) for each in value])
    if kind is not dict:
        return value
    if 0 not in value:
        return {key.decode("utf-8", "surrogatepass"): _in(each) for key, each in value.items()}
    number, parts = value[0], [_in(each) for each in value[1]]
    if number < 0:
        what, where, mend = parts
        return _ERRORS[-1 - number](what, where=where, mend=mend)
    made = CLASSES[number]
    return made(**dict(zip(_FIELDS[made], parts, strict=True)))
