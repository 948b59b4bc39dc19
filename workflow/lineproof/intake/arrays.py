"""Columns of a raw file as the intake wants them: text without blanks around it, float64, int64 or dates."""

from __future__ import annotations

from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc

from lineproof.intake.lines import has_blanks
from lineproof.intake.stopping import stop

NUMERIC = frozenset({"return", "final_return", "size", "price", "rate"})
_EXACT = 2.0**53  # whole floats below this are exact


def settled(array: pa.Array, ours: str, reading: dict[str, Any], where: str) -> pa.Array:
    """A column in one of the types of `RawBlock`, not trimmed yet.

    Returns, sizes, prices and rates that are numbers stay numbers; dates stay dates; a date that is a number is given
    as its digits, since `dates` tells how to read them; every other column is text, whole numbers without ".0".

    Raises KnownProblem when the column holds lists or the like.
    """
    array = _plain(array, where)
    kind = array.type
    if pa.types.is_string(kind):
        return pc.fill_null(array, "")
    if ours in NUMERIC:
        if pa.types.is_null(kind):
            return array.cast(pa.float64())
        if _is_number(kind):
            return _number(array)
    if ours == "date" and pa.types.is_temporal(kind) and not pa.types.is_time(kind):
        return _date(array)
    return as_text(array, reading)


def _plain(array: pa.Array, where: str) -> pa.Array:
    if pa.types.is_dictionary(array.type):
        array = array.dictionary_decode()
    kind = array.type
    if pa.types.is_nested(kind):
        raise stop(where, f"it holds values of the type {kind}", "give numbers, text or dates")
    if isinstance(array, pa.ExtensionArray):
        array, kind = array.storage, array.storage.type
    if pa.types.is_fixed_size_binary(kind):
        array = array.cast(pa.binary())
    if pa.types.is_large_string(kind) or pa.types.is_string_view(kind) or _is_binary(array.type):
        array = array.cast(pa.string())
    return array


def _is_binary(kind: pa.DataType) -> bool:
    return (
        pa.types.is_binary(kind) or pa.types.is_large_binary(kind) or pa.types.is_binary_view(kind)
    )


def _is_number(kind: pa.DataType) -> bool:
    return pa.types.is_integer(kind) or pa.types.is_floating(kind) or pa.types.is_decimal(kind)


def _number(array: pa.Array) -> pa.Array:
    if pa.types.is_integer(array.type):
        wide = pa.types.is_uint64(array.type)
        return array.cast(pa.float64() if wide else pa.int64(), safe=False)
    array = array.cast(pa.float64(), safe=False)
    return pc.if_else(pc.is_nan(array), None, array)


def _date(array: pa.Array) -> pa.Array:
    if pa.types.is_date64(array.type):
        return array.cast(pa.date32())
    if pa.types.is_timestamp(array.type) and array.type.tz:
        return pc.local_timestamp(array)
    return array


def as_text(array: pa.Array, reading: dict[str, Any]) -> pa.Array:
    """A settled or plain column as it would stand in a text file, "" where there is nothing."""
    kind = array.type
    if pa.types.is_string(kind):
        return pc.fill_null(array, "")
    if pa.types.is_date(kind) or pa.types.is_timestamp(kind):
        text = pc.strftime(array.cast(pa.timestamp("s"), safe=False), format=reading["dates"])
    elif pa.types.is_floating(kind):
        text = _digits(_number(array))
    elif pa.types.is_decimal(kind):
        text = pc.replace_substring_regex(array.cast(pa.string()), r"\.0+$", "")
    else:
        text = array.cast(pa.string())
    if reading.get("decimal", "point") == "comma" and _is_number(kind):
        text = pc.replace_substring(text, ".", ",")
    return pc.fill_null(text, "")


def _digits(array: pa.Array) -> pa.Array:
    """Floats as text: whole ones without ".0"."""
    whole = pc.and_(pc.equal(array, pc.floor(array)), pc.less(pc.abs(array), _EXACT))
    whole = pc.fill_null(whole, False)
    as_whole = pc.if_else(whole, array, None).cast(pa.int64()).cast(pa.string())
    return pc.coalesce(as_whole, array.cast(pa.string()))


def trimmed(array: pa.Array) -> tuple[pa.Array, int]:
    """The column without blanks around its texts, and how many had some; a column of no text is left alone."""
    if not pa.types.is_string(array.type) or not len(array) or not _may_have_blanks(array):
        return array, 0
    bare = pc.utf8_trim_whitespace(array)
    return bare, pc.sum(pc.not_equal(bare, array)).as_py() or 0


def _may_have_blanks(array: pa.Array) -> bool:
    data = array.buffers()[2]
    return data is not None and len(data) > 0 and bool(has_blanks(np.frombuffer(data, np.uint8)))
