"""One step of a compressed HDF5 variable, unpacked outside the library's lock: variables are read side by side."""

from __future__ import annotations

import zlib

import h5py
import numpy as np

_SHUFFLE, _DEFLATE = h5py.h5z.FILTER_SHUFFLE, h5py.h5z.FILTER_DEFLATE


def read_step(dataset: h5py.Dataset, index: int) -> np.ndarray | None:
    """Values (n,) at one step of the first dimension; None where the library must read them.

    Done for variables of two dimensions that are stored one step a chunk (or in several), shuffled and
    deflated or one of the two. HDF5 unpacks under a lock; zlib does not.
    """
    if dataset.ndim != 2 or dataset.chunks is None or dataset.chunks[0] != 1 or dataset.dtype.kind not in "iuf":
        return None
    filters = _filters(dataset)
    if filters is None:
        return None
    width, chunk, size = dataset.shape[1], dataset.chunks[1], dataset.dtype.itemsize
    out = np.empty(width, dataset.dtype)
    as_bytes = out.view(np.uint8).reshape(width, size)
    for first in range(0, width, chunk):
        packed = _packed(dataset, (index, first))
        if packed is None:
            return None
        data = zlib.decompress(packed, bufsize=chunk * size) if _DEFLATE in filters else packed
        if len(data) != chunk * size:
            raise OSError("a chunk has the wrong length")
        stored = np.frombuffer(data, np.uint8)
        stored = stored.reshape(size, chunk).T if _SHUFFLE in filters else stored.reshape(chunk, size)
        last = min(first + chunk, width)
        for byte in range(size):
            as_bytes[first:last, byte] = stored[: last - first, byte]
    return out


def _filters(dataset: h5py.Dataset) -> tuple[int, ...] | None:
    """The filters of a variable in order; None where there are others than these two."""
    made = dataset.id.get_create_plist()
    filters = tuple(made.get_filter(i)[0] for i in range(made.get_nfilters()))
    return filters if filters in ((_SHUFFLE, _DEFLATE), (_DEFLATE,)) else None


def _packed(dataset: h5py.Dataset, place: tuple[int, int]) -> bytes | None:
    """The bytes of a chunk as stored; None where it was never written or not filtered like the rest."""
    try:
        mask, packed = dataset.id.read_direct_chunk(place)
    except (OSError, RuntimeError):
        return None
    return packed if mask == 0 else None
