"""Arrays of HDF5 content held in memory; nothing in it may lead to another file, and no shape is believed before it is checked."""

from __future__ import annotations

import io
from typing import Any

import numpy as np
from numpy.typing import NDArray

from structviz.errors import FormatError, StructvizError

FILTERS = {1: "deflate", 2: "shuffle", 3: "checksum", 32000: "LZF"}  # numbers: the filter registry of the HDF5 file format
MOST_RATIO = 1100  # deflate cannot pack tighter
SPARE = 2**25  # bytes that packed arrays may take beyond ten times the file
LONGEST_MARK = 256  # bytes of text
DAMAGED = "the HDF5 file is damaged, cut short or not the one that belongs to it: export both again"
BROKEN = (OSError, KeyError, ValueError, TypeError, OverflowError, AttributeError, RuntimeError, IndexError, MemoryError)


def library() -> Any:
    """Return h5py; StructvizError says how to install it."""
    try:
        import h5py
    except ImportError:
        raise StructvizError("HDF5 files need h5py, which is not installed", hint="pip install 'structviz[formats]'") from None
    return h5py


def opened(content: bytes, file: str) -> Any:
    """Return HDF5 content opened for reading; FormatError where it is none."""
    h5py = library()
    try:
        return h5py.File(io.BytesIO(content), "r")
    except BROKEN as error:
        raise FormatError(file, f"content that is not whole HDF5 ({shortened(error)})", "an HDF5 file", hint=DAMAGED) from None


def mark_of(store: Any) -> str:
    """Return the attribute `uuid` of an open content in small letters, "" where there is none of fixed length.

    Text of variable length lies in a heap, in which the library goes round in circles where it is damaged: it is never read.
    """
    try:
        held = store.attrs.get_id("uuid") if "uuid" in store.attrs else None
        if held is None or held.dtype.kind != "S" or held.dtype.itemsize > LONGEST_MARK or held.shape != ():
            return ""
        found = np.zeros((), held.dtype)
        held.read(found)
        return bytes(found[()]).decode("ascii", "replace").strip().lower()
    except BROKEN:
        return ""


def array_at(store: Any, path: str, count: int, file: str) -> NDArray:
    """Return the flat numbers of the dataset at a path, which must be `count`; FormatError where it is anything else."""
    wanted = f"a dataset of {count:,} numbers at {path[:120]!r}"
    try:
        dataset = dataset_at(store, path, file)
        refused = objection(dataset, count, int(store.id.get_filesize()))
        if refused:
            raise FormatError(file, f"{refused} at {path[:120]!r}", wanted, hint=DAMAGED)
        return np.asarray(dataset[()]).reshape(-1)
    except FormatError:
        raise
    except BROKEN as error:
        raise FormatError(file, f"{path[:120]!r} that cannot be read ({shortened(error)})", wanted, hint=DAMAGED) from None


def dataset_at(store: Any, path: str, file: str) -> Any:
    """Return the dataset at a path, every step of which is a hard link; FormatError for links that lead elsewhere."""
    h5py = library()
    found = store
    for step in path.strip("/").split("/"):
        if not isinstance(found, h5py.Group) or not step or step == ".":
            raise KeyError(f"no {step[:80]!r}")
        link = found.get(step, getlink=True)
        if link is None:
            raise KeyError(f"no {step[:80]!r}")
        if not isinstance(link, h5py.HardLink):
            hint = "copy the arrays into the HDF5 file itself"
            raise FormatError(file, f"a link in place of {path[:120]!r}", "the array itself", hint=hint)
        found = found[step]
    return found


def objection(dataset: Any, count: int, size: int) -> str:
    """Return in words why a dataset is not read, "" where it may be: judged from its description alone."""
    if not isinstance(dataset, library().Dataset):
        return "a group"
    if dataset.dtype.kind not in "iuf" or dataset.dtype.itemsize > 8:
        return f"values of type {str(dataset.dtype)[:40]}"
    if dataset.shape is None or dataset.size != count:
        return f"an array of shape {dataset.shape}"
    return storage_objection(dataset, size)


def storage_objection(dataset: Any, size: int) -> str:
    """Return in words why the way a dataset is stored in a file of `size` bytes is not trusted, "" where it is."""
    if dataset.is_virtual or dataset.external:
        return "an array whose values lie in another file"
    made = dataset.id.get_create_plist()
    used = [made.get_filter(number)[0] for number in range(made.get_nfilters())]
    if unknown := [number for number in used if number not in FILTERS]:
        return f"values packed by filter {unknown[0]}"
    stored, chunk = dataset.id.get_storage_size(), int(np.prod(dataset.chunks or (0,), dtype=float)) * dataset.dtype.itemsize
    if dataset.size and not stored:
        return "an array that was never written"
    if max(dataset.nbytes, chunk) > min(MOST_RATIO * max(stored, 1), 10 * size + SPARE):
        return f"{dataset.nbytes:,} bytes unpacked from {stored:,}"
    return ""


def shortened(error: Exception) -> str:
    """Return the message of an error on one line, not too long."""
    return " ".join(str(error).split())[:160] or type(error).__name__
