"""Own anatomy of a case: which files stand in the place of which elements, checked before anything is reckoned on them.

A layer is a folder with a mapping table and the files that it names (:mod:`byway.knowledge.space.mapping`). Layers lie
on the template in order; each takes the place of other elements, and its name stands beside every number on them.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from byway.knowledge.cases.files import inside
from byway.knowledge.cases.model import AnatomySpec
from byway.knowledge.faults import BywayError, CaseError, Fault, FaultReport
from byway.knowledge.space.atlas import Template
from byway.knowledge.space.mapping import MappingRow, read_mapping
from byway.knowledge.space.own import own_anatomy
from byway.knowledge.space.tractograms import SUFFIXES
from byway.knowledge.space.transforms import Axes, Transform, read_affine, read_displacement

__all__ = ["KINDS", "OwnLayer", "folder_layer", "laid_on", "layers_of"]

KINDS = {
    "tract_maps": "probability maps (NIfTI, no label)",
    "labels": "a label volume and a label",
    "bundles": f"streamlines ({', '.join(SUFFIXES)})",
}
TABLES = ("mapping.csv", "mapping.tsv")


@dataclass(frozen=True)
class OwnLayer:
    """One anatomy to lay on the template.

    Parameters
    ----------
    name : str
        Whose it is.
    mapping : Path
        The mapping table.
    kind : str, optional
        What every row of the table must be (:data:`KINDS`); any where None.
    affine, displacement : Path, optional
        From the mm of tractogram files to template mm; at most one of the two.
    axes : {"ras", "lps"}, optional
        Directions of the displacement's components.
    spread_mm : float, optional
        Spread of the own elements, in place of the usual one.
    root : Path, optional
        Folder that no file may lie outside of.
    """

    name: str
    mapping: Path
    kind: Literal["tract_maps", "labels", "bundles"] | None = None
    affine: Path | None = None
    displacement: Path | None = None
    axes: Axes | None = None
    spread_mm: float | None = None
    root: Path | None = None

    def transform(self) -> Transform | None:
        """The transform to template space, or None where the files lie there.

        Raises
        ------
        BywayError
            Both an affine and a displacement, or a displacement whose directions are not told.
        ImageError
            A file that is no transform.
        """
        if self.affine is not None and self.displacement is not None:
            raise BywayError(Fault("own-transform", self.name, "an affine and a displacement", "one of the two"))
        if self.affine is not None:
            return read_affine(self.affine)
        if self.displacement is None:
            return None
        if self.axes is None:
            raise BywayError(Fault("own-transform", self.name, "a displacement without its axes", "ras or lps",
                                   "say in which directions its components count"))  # fmt: skip
        return read_displacement(self.displacement, self.axes)

    def prints(self, elements: Sequence[str]) -> tuple[tuple[str, int, int], ...]:
        """Name, size and time of every file, to tell whether what was read still holds."""
        paths = [self.mapping, self.affine, self.displacement]
        if self.mapping.is_file():
            paths += sorted({row.path for row in self.rows(elements)})
        stats = [(path, path.stat()) for path in paths if path is not None and path.exists()]
        return tuple((str(path), stat.st_size, stat.st_mtime_ns) for path, stat in stats)

    def rows(self, elements: Sequence[str]) -> tuple[MappingRow, ...]:
        """The rows of the table, each of the layer's kind and inside its root.

        Raises
        ------
        ImageError, CaseError
            Holding every fault of the table.
        """
        rows = read_mapping(self.mapping, elements)
        report = FaultReport()
        for row in rows:
            kind = _kind(row)
            if self.kind is not None and kind != self.kind:
                report.add("own-kind", row.where, f"{row.path.name} with kind {self.kind}", KINDS[self.kind],
                           f"kind {kind}, or another file")  # fmt: skip
            if self.root is not None and not row.path.resolve().is_relative_to(self.root.resolve()):
                report.add("outside", row.where, f"the file name {str(row.path)!r}", "a file inside the case folder",
                           "copy it there")  # fmt: skip
        report.raise_if_grave(CaseError)
        return rows


def _kind(row: MappingRow) -> str:
    if row.path.suffix.lower() in SUFFIXES:
        return "bundles"
    return "tract_maps" if row.label is None else "labels"


def layers_of(specs: Iterable[AnatomySpec], folder: Path) -> tuple[OwnLayer, ...]:
    """The layers that case.yaml names, with their paths.

    Raises
    ------
    CaseError
        A path that leads out of the case folder, or a mapping table that is not there.
    """
    layers = []
    for spec in specs:
        place = inside(folder, spec.folder)
        layers.append(OwnLayer(
            name=spec.name,
            mapping=inside(folder, f"{spec.folder}/{spec.mapping}") if spec.mapping else _table(place),
            kind=spec.kind,
            affine=inside(folder, f"{spec.folder}/{spec.affine}") if spec.affine else None,
            displacement=inside(folder, f"{spec.folder}/{spec.displacement}") if spec.displacement else None,
            axes=spec.axes,
            spread_mm=spec.spread_mm,
            root=folder,
        ))  # fmt: skip
    return tuple(layers)


def folder_layer(
    folder: Path,
    *,
    name: str | None = None,
    affine: Path | None = None,
    displacement: Path | None = None,
    axes: Axes | None = None,
) -> OwnLayer:
    """A layer from any folder with a mapping table; it is called after the folder where it is not named.

    Raises
    ------
    CaseError
        No such folder, or no mapping table in it.
    """
    return OwnLayer(name or folder.resolve().name, _table(folder), None, affine, displacement, axes)


def _table(folder: Path) -> Path:
    found = [folder / name for name in TABLES if (folder / name).is_file()]
    if len(found) != 1:
        there = "both" if found else "neither" if folder.is_dir() else "no such folder"
        raise CaseError(Fault("own-mapping", str(folder), there, f"a folder with {' or '.join(TABLES)}",
                              "say in that table which file stands for which element"))  # fmt: skip
    return found[0]


def laid_on(template: Template, layers: Sequence[OwnLayer]) -> tuple[Template, tuple[str, ...]]:
    """The template with the layers on it, and notes on what was left out of their files.

    Raises
    ------
    ImageError, CaseError, BywayError
        A file that cannot be used; two layers of one name, or one element in two.
    """
    notes: list[str] = []
    whose: dict[str, str] = {}
    for layer in layers:
        rows = layer.rows(template.geometry.element_ids)
        for row in rows:
            if row.element in whose:
                raise CaseError(Fault("own-twice", row.where, f"{row.element}, which {whose[row.element]} has already",
                                      "each element in one anatomy", "remove one of the rows"))  # fmt: skip
        if layer.name in whose.values():
            raise CaseError(Fault("own-name", "anatomy", f"the name {layer.name!r} twice", "a name for each"))
        whose.update(dict.fromkeys((row.element for row in rows), layer.name))
        own = own_anatomy(template, layer.mapping, name=layer.name, to_template=layer.transform(),
                          spread_mm=layer.spread_mm)  # fmt: skip
        template = own.template
        notes += own.notes
    return template, tuple(notes)
