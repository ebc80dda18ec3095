"""One NetCDF file's variables by name, dimensions and attributes; values are read when asked for.

NetCDF4 goes through h5py, the classic formats through scipy. The file is open only while something
is read from it, so nothing is left locked and any number of files may make up a run.
"""

from __future__ import annotations

import gc
import os
import threading
import warnings
import zlib
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import h5netcdf
import h5py
import numpy as np
from scipy.io import netcdf_file

from . import chunks

_BLOCK_BYTES = 128 * 2**20  # most that one variable's block of times may hold
_HDF5 = b"\x89HDF\r\n\x1a\n"


@dataclass(frozen=True, eq=False)
class Store:
    """An opened NetCDF file: its header.

    Raises ``ValueError`` on any read after the file on disk has changed.
    """

    path: Path
    attributes: dict[str, Any]
    variables: dict[str, Stored]
    groups: tuple[str, ...]
    hdf5: bool
    stamp: tuple[int, int]

    @contextmanager
    def opened(self) -> Iterator[Mapping[str, Any]]:
        """The file's variables by name, readable inside the block only."""
        if _stamp(self.path) != self.stamp:
            raise ValueError(f"{self.path.name} has changed on disk since it was opened; open it again.")
        try:
            if self.hdf5:
                with h5py.File(self.path, "r") as file:
                    yield file
            else:
                with netcdf_file(str(self.path), "r", mmap=True) as file:
                    arrays = {name: variable.data for name, variable in file.variables.items()}
                    try:
                        yield arrays
                    finally:
                        arrays.clear()  # a map on disk can only be closed when no array refers to it
        except (OSError, zlib.error) as error:
            raise ValueError(
                f"{self.path.name}: a part cannot be read ({_first_line(error)}); copy or export the file again."
            ) from error


@dataclass(frozen=True, eq=False)
class Stored:
    """A variable in a file: what the header says, and its values on request."""

    store: Store
    name: str
    dimensions: tuple[str, ...]
    shape: tuple[int, ...]
    dtype: np.dtype
    attributes: dict[str, Any]
    chunks: tuple[int, ...] | None
    _block: dict[str, Any] = field(default_factory=dict, repr=False)
    _lock: threading.Lock = field(default_factory=threading.Lock, repr=False)

    def __str__(self) -> str:
        return f"{self.file}: variable {self.name}"

    @property
    def file(self) -> str:
        """Name of the file, for messages."""
        return self.store.path.name

    def text(self, attribute: str) -> str:
        """An attribute as text; empty where it is missing."""
        value = self.attributes.get(attribute)
        return "" if value is None else str(value).strip()

    def raw(self, index: Any = ...) -> np.ndarray:
        """Values as stored, in the machine's byte order."""
        with self.store.opened() as variables:
            values = self._step(variables[self.name], index) if self.store.hdf5 else None
            if values is None:
                values = np.array(variables[self.name][() if self.shape == () else index])
        return values.astype(values.dtype.newbyteorder("="), copy=False)

    def _step(self, dataset: h5py.Dataset, index: Any) -> np.ndarray | None:
        single = isinstance(index, tuple) and len(index) == 1 and isinstance(index[0], int)
        return chunks.read_step(dataset, index[0]) if single else None

    def values(self, index: Any = ...) -> np.ndarray:
        """Values as float64: unpacked, missing ones NaN."""
        return self.unpacked(self.raw(index))

    def unpacked(self, raw: np.ndarray) -> np.ndarray:
        """Stored numbers to float64 by the packing attributes; fill and out-of-range values are NaN."""
        missing = self._missing(raw)
        out = raw.astype(np.float64)
        scale, offset = (self._number(a, default) for a, default in (("scale_factor", 1.0), ("add_offset", 0.0)))
        if scale != 1.0:
            out *= scale
        if offset != 0.0:
            out += offset
        if missing is not None:
            out[missing] = np.nan
        return out

    def along(self, dimension: str, index: int) -> np.ndarray:
        """Raw values at one place along a dimension, that dimension dropped.

        Where the file keeps many of its places together, they are read together and remembered, as
        many as fit in a fixed number of bytes.
        """
        axis = self.dimensions.index(dimension)
        together = self._together(axis)
        if together == 1:
            return self.raw((slice(None),) * axis + (index,))
        start = index - index % self.chunks[axis] if self.chunks else 0
        start += (index - start) // together * together
        with self._lock:
            if self._block.get("start") != start:
                stop = min(start + together, self.shape[axis])
                block = self.raw((slice(None),) * axis + (slice(start, stop),))
                self._block.update(start=start, values=np.ascontiguousarray(np.moveaxis(block, axis, 0)))
            return self._block["values"][index - start]

    def _together(self, axis: int) -> int:
        """Places along an axis that are worth reading at once."""
        if self.chunks:
            stored_together = self.chunks[axis]
        else:
            stored_together = self.shape[axis] if axis else 1
        frame = max(self.dtype.itemsize * int(np.prod(self.shape)) // max(self.shape[axis], 1), 1)
        return max(1, min(stored_together, _BLOCK_BYTES // frame))

    def _missing(self, raw: np.ndarray) -> np.ndarray | None:
        masks = []
        for name in ("_FillValue", "missing_value"):
            for value in self.numbers(name):
                if not _is_nan(value):
                    masks.append(raw == as_stored(value, raw.dtype))
        low, high = self._valid()
        masks += [raw < low] if low is not None else []
        masks += [raw > high] if high is not None else []
        missing = np.logical_or.reduce(masks) if masks else None
        return missing if missing is not None and missing.any() else None

    def _valid(self) -> tuple[Any, Any]:
        both = self.numbers("valid_range")
        if len(both) == 2:
            return both[0], both[1]
        low, high = (self.numbers(name) for name in ("valid_min", "valid_max"))
        return (low[0] if len(low) else None), (high[0] if len(high) else None)

    def numbers(self, attribute: str) -> np.ndarray:
        """An attribute's numbers, as stored; none where it is missing. ``ValueError`` when it holds something else."""
        values = np.atleast_1d(self.attributes.get(attribute, [])).ravel()
        if len(values) and values.dtype.kind not in "iufb":
            raise ValueError(f"{self}: {attribute} is {self.attributes[attribute]!r}, which is no number; mend the attribute.")
        return values

    def _number(self, attribute: str, default: float) -> float:
        value = self.attributes.get(attribute, default)
        try:
            return float(np.ravel(value)[0])
        except (TypeError, ValueError, IndexError):
            raise ValueError(f"{self}: {attribute} is {value!r}, which is no number; mend the attribute.") from None


def as_stored(value: Any, dtype: np.dtype) -> Any:
    """A fill value in the type of the stored numbers; integers wrap as they do in files."""
    if dtype.kind in "iu":
        return np.array(int(value)).astype(dtype)[()]
    return np.array(value).astype(dtype)[()]


def open_store(path: Path) -> Store:
    """The header of a NetCDF file.

    Raises
    ------
    FileNotFoundError
        No such file.
    ValueError
        Empty, not NetCDF, truncated, or in a format that cannot be read.
    """
    kind = sniff(path)
    if kind not in ("hdf5", "classic"):
        raise ValueError(f"{path.name} is not a NetCDF file; export the results as NetCDF with a UGRID mesh.")
    # What scipy leaves half open when a header is damaged warns as it is cleared away.
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            return _open_hdf5(path) if kind == "hdf5" else _open_classic(path)
        except (OSError, KeyError, RuntimeError, TypeError, IndexError, ValueError, AttributeError, SyntaxError) as error:
            reason = _first_line(error)
        gc.collect()
    raise ValueError(f"{path.name} is cut short or damaged ({reason}); copy or export the file again.")


def sniff(path: Path) -> str:
    """What a file's first bytes say it is: hdf5, classic, cdf5, geopackage, tiff, parquet or text."""
    if not path.exists():
        raise FileNotFoundError(f"{path} is not there; check the path.")
    with open(path, "rb") as stream:
        head = stream.read(2048)
    if not head:
        raise ValueError(f"{path.name} is empty; copy or export the file again.")
    if head[:3] == b"CDF" and head[3:4] == b"\x05":
        raise ValueError(
            f"{path.name} is in the classic 64-bit-data format, which is not read; convert it to NetCDF4 and open that."
        )
    magic = {
        _HDF5: "hdf5", b"CDF\x01": "classic", b"CDF\x02": "classic", b"SQLite format 3\0": "geopackage",
        b"PAR1": "parquet", b"II*\0": "tiff", b"MM\0*": "tiff", b"II+\0": "tiff", b"MM\0+": "tiff",
    }
    for start, kind in magic.items():
        if head.startswith(start):
            return kind
    if head[512:520] == _HDF5 or head[1024:1032] == _HDF5:
        return "hdf5"
    return "binary" if b"\0" in head else "text"


def _open_hdf5(path: Path) -> Store:
    with h5py.File(path, "r") as raw:
        raw.attrs.get("_nc3_strict")  # a damaged root fails here; h5netcdf would leave itself half open
        with h5netcdf.File(raw, "r", phony_dims="sort") as file:
            header = [
                (name, tuple(v.dimensions), tuple(v.shape), v.dtype, _attributes(v.attrs), v.chunks)
                for name, v in file.variables.items()
            ]
            attributes, groups = _attributes(file.attrs), tuple(file.groups)
    return _store(path, attributes, header, groups, True)


def _open_classic(path: Path) -> Store:
    with netcdf_file(str(path), "r", mmap=True) as file:
        header = [
            (name, tuple(v.dimensions), tuple(v.shape), v.data.dtype.newbyteorder("="), _attributes(v._attributes), ())
            for name, v in file.variables.items()
        ]
        attributes = _attributes(file._attributes)
    return _store(path, attributes, header, (), False)


def _store(path, attributes, header, groups, hdf5) -> Store:
    variables: dict[str, Stored] = {}
    store = Store(path, attributes, variables, groups, hdf5, _stamp(path))
    for name, dimensions, shape, dtype, own, together in header:
        variables[name] = Stored(store, name, dimensions, shape, np.dtype(dtype), own, together or None)
    return store


def _attributes(given: Mapping[str, Any]) -> dict[str, Any]:
    out: dict[str, Any] = {}
    for name, value in given.items():
        if isinstance(value, h5py.Empty):
            value = ""
        elif isinstance(value, bytes):
            value = value.decode("utf-8", "replace")
        elif isinstance(value, np.ndarray) and value.size == 1:
            value = value.ravel()[0]
            value = value.decode("utf-8", "replace") if isinstance(value, bytes) else value
        if isinstance(value, str):  # bytes that are no UTF-8 come as halves of characters, which cannot be printed
            value = value.encode("utf-8", "surrogateescape").decode("utf-8", "replace")
        out[name] = value
    return out


def _stamp(path: Path) -> tuple[int, int]:
    found = os.stat(path)
    return found.st_size, found.st_mtime_ns


def _is_nan(value: Any) -> bool:
    return isinstance(value, (float, np.floating)) and bool(np.isnan(value))


def _first_line(error: Exception) -> str:
    text = str(error).strip().splitlines()
    return text[0].rstrip(".") if text else type(error).__name__
