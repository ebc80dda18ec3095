"""The pack's data files: JSON and arrays in one compressed block, as text that a script tag can carry.

A block is gzip of: the length of the JSON in bytes (uint32, little end first), the JSON, then the arrays one
after the other. 16-bit arrays are stored as two planes, low bytes first: smooth fields pack better so.
"""

from __future__ import annotations

import base64
import gzip
import json
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

_KINDS = {"uint8": "u1", "uint16": "u2", "int16": "i2", "uint32": "u4", "float32": "f4"}


@dataclass(frozen=True, eq=False)
class Quantised:
    """Whole numbers with what one of them is worth: value = low + step * number."""

    numbers: np.ndarray
    low: float
    step: float


def quantised(values: np.ndarray) -> Quantised:
    """Values as uint16 from their least to their greatest; half a step is the greatest error, and 0 stays 0."""
    low, high = (float(values.min()), float(values.max())) if values.size else (0.0, 0.0)
    step = (high - low) / 65534 or 1.0
    first = np.floor(low / step)
    return Quantised((np.round(values / step) - first).astype(np.uint16), float(first * step), step)


def signed(values: np.ndarray) -> Quantised:
    """Values as int16 about 0, so that nothing stays nothing."""
    step = float(np.abs(values).max(initial=0.0)) / 32767 or 1.0
    return Quantised(np.round(values / step).astype(np.int16), 0.0, step)


def block(content: Mapping[str, Any], arrays: Mapping[str, np.ndarray]) -> str:
    """One data item as base64 text.

    Raises ``ValueError`` for an array of a kind that the page does not read.
    """
    listed, parts = [], []
    for name, array in arrays.items():
        flat = np.ascontiguousarray(array).ravel()
        if flat.dtype.name not in _KINDS:
            raise ValueError(f"the pack holds no {flat.dtype.name}; give {name} as one of {', '.join(_KINDS)}.")
        listed.append([name, _KINDS[flat.dtype.name], flat.size])
        parts.append(_planes(flat))
    head = json.dumps({"content": content, "arrays": listed}, allow_nan=False, ensure_ascii=False, separators=(",", ":")).encode()
    whole = len(head).to_bytes(4, "little") + head + b"".join(parts)
    # No time stamp inside: the same review gives the same bytes.
    return base64.b64encode(gzip.compress(whole, 9, mtime=0)).decode("ascii")


def script(name: str, text: str) -> str:
    """The file that hands an item to the page; names and base64 hold nothing that would need escaping."""
    return f'PACK.put("{name}","{text}");\n'


def _planes(flat: np.ndarray) -> bytes:
    if flat.dtype.itemsize != 2:
        return flat.astype(flat.dtype.newbyteorder("<")).tobytes()
    pairs = flat.astype(flat.dtype.newbyteorder("<")).view(np.uint8).reshape(-1, 2)
    return np.ascontiguousarray(pairs.T).tobytes()
