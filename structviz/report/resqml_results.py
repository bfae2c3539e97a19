"""Results as properties on the triangles of the RESQML package that was judged: a new package beside the other outputs."""

from __future__ import annotations

import hashlib
import posixpath
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from pathlib import Path, PurePosixPath
from urllib.parse import unquote
from xml.etree.ElementTree import Element

import numpy as np

from structviz.analysis import Analysis, FaultResult
from structviz.errors import InputError, StructvizError
from structviz.io.epc import Package, external_names, package_of, title_of
from structviz.io.format import Piece
from structviz.io.formats.epc import FORMATS, surfaces_of
from structviz.io.reading import source_of
from structviz.io.resqml_properties import Host, Values, with_properties
from structviz.io.resqml_surfaces import TRIANGULATED, Mesh
from structviz.io.zip_parts import unsafe
from structviz.report.annotated import VERDICT_CODES, triangle_values
from structviz.report.names import printable

STEM = "results"
PROPERTIES = (  # of triangle_values; title in the package, unit, kind among the standard ones
    ("dip_deg", "dip", "dega", "dip"),
    ("strike_deg", "strike", "dega", "azimuth"),
    ("predicted_rake_deg", "predicted rake", "dega", "plane angle"),
    ("misfit_deg", "misfit of declared and predicted slip", "dega", "plane angle"),
    ("slip_tendency", "slip tendency", "Euc", "unitless"),
)


@dataclass
class _Inputs:
    """The files of the run, read again: only those that were read, and only as they were."""

    folder: Path
    hashes: dict[str, str]
    contents: dict[str, bytes] = field(default_factory=dict)

    def read(self, name: str) -> bytes:
        """Return the content of a file of the run; InputError where it was none, or has changed since."""
        if name not in self.hashes:
            raise InputError(name, "a file that was not read", "a file of the model", hint="run it again")
        try:
            content = (self.folder / name).read_bytes()
        except OSError as error:
            raise InputError(
                name, f"a file that cannot be read ({error.strerror})", "the file that was judged", hint="run it again"
            ) from None
        if hashlib.sha256(content).hexdigest() != self.hashes[name]:
            raise InputError(name, "a file that has changed since it was judged", "the same file", hint="run it again")
        self.contents[name] = content
        return content


def package_with_results(analysis: Analysis, folder: Path, free: Callable[[str], bool]) -> tuple[dict[str, bytes], tuple[str, ...]]:
    """Return the files of a package with results by name, and in words what is missing.

    They are results.epc, a copy of the one package among the inputs, with values on its triangles, the HDF5 file of these, and copies
    of the HDF5 files that it names. Nothing comes back where no input is a package. `folder` is where the paths of the inputs begin;
    `free` says whether a name may be used beside the other outputs.
    """
    names = [entry.path for entry in analysis.model.inputs if entry.path.lower().endswith(FORMATS[0].suffixes)]
    if len(names) != 1:
        return {}, (f"no {STEM}.epc was written: the model is of {len(names)} packages",) if names else ()
    inputs = _Inputs(folder, {entry.path: entry.sha256 for entry in analysis.model.inputs})
    try:
        return _with_results(analysis, names[0], inputs, free)
    except StructvizError as error:
        return {}, (f"no {STEM}.epc was written: {error.message}",)


def _with_results(analysis: Analysis, file: str, inputs: _Inputs, free: Callable[[str], bool]) -> tuple[dict[str, bytes], tuple[str, ...]]:
    content = inputs.read(file)
    if not FORMATS[0].sniff(content):
        return {}, ()
    package = package_of(content, file, lambda name: inputs.read(_beside(file, name)))
    values, missing = _values(analysis, package)
    if not values:
        return {}, missing
    copies, strangers = _copies(package, inputs, free)
    named = external_names(package)
    h5_name = _free_name(lambda name: free(name) and name not in named)
    epc, h5 = with_properties(content, file, values, h5_name)
    return {f"{STEM}.epc": epc, h5_name: h5} | copies, (*missing, *strangers)


def _beside(file: str, name: str) -> str:
    """Return a file named in another as the inputs name it."""
    return posixpath.normpath(posixpath.join(posixpath.dirname(file), name))


def _values(analysis: Analysis, package: Package) -> tuple[list[tuple[Host, list[Values]]], tuple[str, ...]]:
    """Return the representation of each fault with its values, and in words which have none."""
    surfaces = surfaces_of(package)
    by_source = {source_of(package.file, piece, len(surfaces)): (piece, root, mesh) for piece, root, mesh in surfaces}
    found: list[tuple[Host, list[Values]]] = []
    missing, used = [], set()
    for result in analysis.faults:
        known = by_source.get(result.fault.surface.source)
        host = _host(package, known) if known else None
        if host is None or host.uuid in used or sum(host.patches) != len(result.fault.surface.triangles):
            missing.append(result.fault.name)
        else:
            used.add(host.uuid)
            found.append((host, _values_of(analysis, result)))
    named = ", ".join(printable(name) for name in missing[:3]) + (f" and {len(missing) - 3} more" if len(missing) > 3 else "")
    return found, (f"{STEM}.epc has no values on {named}: not triangulated sets of their own in it",) if missing else ()


def _host(package: Package, known: tuple[Piece, Element, Mesh]) -> Host | None:
    """Return the representation of a surface, None for a grid."""
    _, root, mesh = known
    name = next(name for name, tree in package.trees.items() if tree is root)
    version = package.versions[name][:3]
    if root.tag != TRIANGULATED or version not in ("2.0", "2.2"):
        return None
    return Host(root.tag, root.get("uuid", ""), name, title_of(root), version, mesh.patches)


def _values_of(analysis: Analysis, result: FaultResult) -> list[Values]:
    """Return the properties of one fault; those of which nothing is known are left out."""
    held = triangle_values(result, analysis.regimes[result.phase] if analysis.regimes else None)
    found = [Values(title, held[key], unit, kind) for key, title, unit, kind in PROPERTIES if np.isfinite(held[key]).any()]
    return [
        *found,
        Values("verdict", held["verdict"], "", "categorical", tuple(sorted(VERDICT_CODES, key=lambda word: VERDICT_CODES[word]))),
    ]


def _copies(package: Package, inputs: _Inputs, free: Callable[[str], bool]) -> tuple[dict[str, bytes], tuple[str, ...]]:
    """Return the HDF5 files that were read, by the names the package gives them, and in words those that it names and are not there."""
    renamed = _beside(package.file, f"{PurePosixPath(package.file).stem}.h5")
    held = inputs.contents
    read = {name: held.get(_beside(package.file, name), held.get(renamed, b"")) for name in map(unquote, package.stores)}
    found = {name: content for name, content in sorted(read.items()) if not unsafe(name) and free(name)}
    told = [f"{name}, which cannot stand beside it under that name" for name in sorted(set(read) - set(found))]
    told += [f"{name}, which holds no surface" for name in sorted(external_names(package) - set(read))]
    return found, tuple(f"{STEM}.epc also names arrays in {printable(words)}: see to it yourself if you need them" for words in told)


def _free_name(free: Callable[[str], bool]) -> str:
    names: Sequence[str] = (f"{STEM}.h5", *(f"{STEM}-{k}.h5" for k in range(2, 1000)))
    return next(name for name in names if free(name))
