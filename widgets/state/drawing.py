"""The lesion while it is being drawn: one byte a voxel, edited by plain records that can be journalled and replayed.

Bit c of a voxel's byte says that compartment c covers it. Loaded compartments may overlap; a drawn voxel belongs to
the compartment that was drawn last. Eight compartments fit.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.lesion import Compartment, CompartmentKind, Lesion
from byway.knowledge.space.grid import TEMPLATE_GRID, Grid
from byway.widgets.state.history import History, Step

__all__ = ["MOST_COMPARTMENTS", "Box", "Change", "Drawing", "Settings", "Style", "drawing_of"]

MOST_COMPARTMENTS = 8

Box = tuple[int, int, int, int, int, int]
Values = NDArray[np.uint8]
Indices = NDArray[np.int64]


@dataclass(frozen=True)
class Style:
    """A compartment's name, kind (core, oedema, other) and effect in [0, 1]; its mask is a bit of the drawing."""

    name: str
    kind: CompartmentKind
    effect: float

    @classmethod
    def of(cls, entry: Mapping[str, Any]) -> Style:
        """From a plain mapping.

        Raises
        ------
        BywayError
            If the kind is unknown or the effect is outside [0, 1].
        """
        kind, effect = str(entry["kind"]), float(entry["effect"])
        if kind not in ("core", "oedema", "other"):
            raise BywayError(Fault("compartment-kind", str(entry["name"]), kind, "core, oedema or other"))
        if not 0.0 <= effect <= 1.0:
            raise BywayError(Fault("compartment-effect", str(entry["name"]), f"effect {effect}", "0 to 1"))
        return cls(str(entry["name"])[:60] or kind, cast(CompartmentKind, kind), effect)


@dataclass(frozen=True)
class Settings:
    """What an edit can change besides voxels, and undo gives back."""

    styles: tuple[Style, ...]
    effect_volume: NDArray[np.float32] | None = None
    scale: str | None = None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Change:
    """What an edit, undo or redo changed.

    Parameters
    ----------
    label : str
        Name of the edit.
    box : tuple of int
        i0, i1, j0, j1, k0, k1 (half open) around the changed voxels; all 0 where none changed.
    voxels : int
        How many voxels changed.
    settings : bool
        Whether compartments or the graded map changed.
    """

    label: str
    box: Box
    voxels: int
    settings: bool


class Drawing:
    """Voxels, compartments and history.

    Parameters
    ----------
    grid : Grid
        Grid of the voxels.
    styles : sequence of Style
        Compartments at the start.
    """

    def __init__(self, grid: Grid = TEMPLATE_GRID, styles: Sequence[Style] = ()) -> None:
        self.grid = grid
        self.bits: Values = np.zeros(grid.shape, np.uint8)
        self.settings = Settings(tuple(styles) or (Style("core", "core", 1.0), Style("oedema", "oedema", 0.3)))
        self.history = History()
        self._tally = np.zeros(256, np.int64)  # voxels by byte, kept in step so that no stroke counts the whole grid
        self._tally[0] = grid.size

    @property
    def flat(self) -> Values:
        """The voxels in C order; a view."""
        return self.bits.reshape(-1)

    @property
    def styles(self) -> tuple[Style, ...]:
        """The compartments, by bit."""
        return self.settings.styles

    def bit(self, compartment: int) -> int:
        """The byte that has only this compartment's bit.

        Raises
        ------
        BywayError
            If there is no such compartment.
        """
        if not 0 <= compartment < len(self.styles):
            raise BywayError(Fault("compartment", "drawing", f"compartment {compartment}",
                                   f"0 to {len(self.styles) - 1}"))  # fmt: skip
        return 1 << compartment

    def voxels_of(self, compartment: int | None) -> Indices:
        """C-order indices of one compartment's voxels, or of all, ascending."""
        if compartment is None:
            return np.flatnonzero(self.flat)
        return np.flatnonzero(self.flat & np.uint8(self.bit(compartment)))

    def counts(self) -> list[int]:
        """Voxels of each compartment."""
        every = np.arange(256)
        return [int(self._tally[(every >> c) & 1 == 1].sum()) for c in range(len(self.styles))]

    def recount(self) -> None:
        """Count anew, after ``bits`` was written to from outside."""
        self._tally = np.bincount(self.flat, minlength=256)

    def _counted(self, old: Values, new: Values) -> None:
        self._tally += np.bincount(new, minlength=256) - np.bincount(old, minlength=256)

    def set(self, label: str, indices: Indices, new: Values | int) -> Change:
        """Give voxels new bytes as one step; those that have them already are left out."""
        values = np.broadcast_to(np.asarray(new, np.uint8), indices.shape)
        old = self.flat[indices]
        moved = old != values
        indices, old, values = indices[moved], old[moved], values[moved]
        if len(indices) == 0:
            return Change(label, (0,) * 6, 0, settings=False)
        self.history.add(Step.of(label, indices, old))
        self.flat[indices] = values
        self._counted(old, values)
        return Change(label, self._box(indices), len(indices), settings=False)

    def configure(self, label: str, settings: Settings, indices: Indices | None = None,
                  new: Values | None = None) -> Change:  # fmt: skip
        """Change settings, and voxels with them, as one step."""
        indices = np.empty(0, np.int64) if indices is None or new is None else indices
        old = self.flat[indices]
        self.history.add(Step.of(label, indices, old, self.settings))
        if new is not None:
            self.flat[indices] = new
            self._counted(old, new)
        self.settings = settings
        return Change(label, self._box(indices), len(indices), settings=True)

    def undo(self) -> Change | None:
        """Take back the last step; None where there is none."""
        return self._crossed(self.history.back(self.flat, self.settings))

    def redo(self) -> Change | None:
        """Do the last undone step again; None where there is none."""
        return self._crossed(self.history.forth(self.flat, self.settings))

    def _crossed(self, crossing: tuple[Step, Indices, Any] | None) -> Change | None:
        if crossing is None:
            return None
        step, indices, settings = crossing
        self._counted(step.other_side(), self.flat[indices])
        changed = settings is not self.settings
        self.settings = settings
        return Change(step.label, self._box(indices), len(indices), changed)

    def _box(self, indices: Indices) -> Box:
        if len(indices) == 0:
            return (0,) * 6
        _, nj, nk = self.grid.shape
        rows, k = np.divmod(indices, nk)
        i, j = rows // nj, rows % nj
        return (int(i[0]), int(i[-1]) + 1, int(j.min()), int(j.max()) + 1, int(k.min()), int(k.max()) + 1)

    def lesion(self, *, drawn_on: str | None = None, boundary_mm: float | None = None) -> Lesion:
        """The drawing as a frozen lesion; empty compartments are left out."""
        parts = []
        for c, style in enumerate(self.styles):
            mask = (self.bits & np.uint8(1 << c)) != 0
            if mask.any():
                parts.append(Compartment(style.name, style.kind, style.effect, mask))
        s = self.settings
        return Lesion(tuple(parts), s.effect_volume, drawn_on, boundary_mm, s.notes, s.scale)

    def restyle(self, compartment: int, **changes: Any) -> Settings:
        """Settings with one compartment's name, kind or effect changed."""
        self.bit(compartment)
        styles = list(self.styles)
        styles[compartment] = Style.of({**vars(styles[compartment]), **changes})
        return replace(self.settings, styles=tuple(styles))


def drawing_of(lesion: Lesion) -> Drawing:
    """A drawing that starts from a lesion; its compartments keep their order and may overlap.

    Raises
    ------
    BywayError
        If there are more than eight compartments.
    """
    if len(lesion.compartments) > MOST_COMPARTMENTS:
        raise BywayError(Fault("compartments", "lesion", f"{len(lesion.compartments)} compartments",
                               f"at most {MOST_COMPARTMENTS}", "merge some of them"))  # fmt: skip
    styles = [Style(c.name, c.kind, c.effect) for c in lesion.compartments]
    drawing = Drawing(styles=styles)
    for c, compartment in enumerate(lesion.compartments):
        drawing.bits[compartment.mask] |= drawing.bit(c)
    drawing.recount()
    drawing.settings = Settings(drawing.styles, lesion.effect_volume, lesion.scale, lesion.notes)
    return drawing
