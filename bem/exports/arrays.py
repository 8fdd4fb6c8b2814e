"""Arrays inside JSON: little-endian bytes in base64, with their type and shape."""

from __future__ import annotations

import base64
import binascii
from typing import Any

import numpy as np

from bem.errors import InputError

DTYPES = ("<f8", "<f4", "<i8", "<i4")
"""Element types that a saved array may have: IEEE floats and integers, little-endian."""


def pack(array: np.ndarray) -> dict[str, Any]:
    """``array`` as {"dtype", "shape", "base64"}, last index fastest; every bit is kept."""
    little = np.asarray(array, dtype=array.dtype.newbyteorder("<"))
    if little.dtype.str not in DTYPES:
        raise InputError(
            f"cannot save an array of {array.dtype}; its type must be one of {', '.join(DTYPES)}"
        )
    return {
        "dtype": little.dtype.str,
        "shape": list(array.shape),
        "base64": base64.b64encode(little.tobytes()).decode("ascii"),
    }


def unpack(packed: Any, name: str) -> np.ndarray:
    """Return the array that ``pack`` wrote, in the byte order of this machine.

    Raises:
        InputError: the entry is damaged; the message calls it ``name``.
    """
    try:
        dtype, shape = packed["dtype"], tuple(packed["shape"])
        data = base64.b64decode(packed["base64"], validate=True)
    except (TypeError, KeyError, ValueError, binascii.Error) as error:
        raise InputError(
            f"{name}: found no dtype, shape and base64 that fit together; save the result again"
        ) from error
    if dtype not in DTYPES:
        raise InputError(f"{name}: dtype: found {dtype!r}; allowed are {', '.join(DTYPES)}")
    return _shaped(data, np.dtype(dtype), shape, name)


def _shaped(data: bytes, dtype: np.dtype, shape: tuple[Any, ...], name: str) -> np.ndarray:
    try:
        flat = np.frombuffer(data, dtype=dtype)
        return flat.reshape(shape).astype(dtype.newbyteorder("="))
    except (ValueError, TypeError) as error:
        raise InputError(
            f"{name}: found {len(data)} bytes, which do not make shape {list(shape)} of "
            f"{dtype.str}; save the result again"
        ) from error
