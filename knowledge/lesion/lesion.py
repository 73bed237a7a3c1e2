"""Lesions as values: labelled compartments, each with an effect, and the effect map that they make."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.space.grid import TEMPLATE_GRID

__all__ = ["Compartment", "CompartmentKind", "Lesion"]

CompartmentKind = Literal["core", "oedema", "other"]


@dataclass(frozen=True, eq=False)
class Compartment:
    """A labelled part of a lesion.

    Parameters
    ----------
    name : str
        What the user calls it.
    kind : {'core', 'oedema', 'other'}
        What it is.
    effect : float
        How far its tissue is out of action, 0 (works as before) to 1 (lost).
    mask : bool array
        Its voxels, on the template grid (MNI152NLin2009aSym, 1 mm).

    Raises
    ------
    BywayError
        The mask is not boolean on the template grid, or the effect is not between 0 and 1.
    """

    name: str
    kind: CompartmentKind
    effect: float
    mask: NDArray[np.bool_] = field(repr=False)

    def __post_init__(self) -> None:
        where = f"compartment {self.name!r}"
        if self.mask.shape != TEMPLATE_GRID.shape or self.mask.dtype != np.bool_:
            found = f"a {self.mask.dtype} mask of shape {self.mask.shape}"
            raise BywayError(Fault("compartment-mask", where, found, f"a bool mask of shape {TEMPLATE_GRID.shape}"))
        if not 0.0 <= self.effect <= 1.0:
            raise BywayError(Fault("compartment-effect", where, f"effect {self.effect}", "an effect between 0 and 1"))

    @cached_property
    def volume_ml(self) -> float:
        """Volume in ml."""
        return int(np.count_nonzero(self.mask)) * TEMPLATE_GRID.voxel_ml


@dataclass(frozen=True, eq=False)
class Lesion:
    """All that is out of action, on the template grid.

    Parameters
    ----------
    compartments : tuple of Compartment
        Labelled parts; where they overlap, the larger effect holds.
    effect_volume : float32 array, optional
        A graded effect map in [0, 1] (for example scaled atrophy z-values), on the template grid.
    drawn_on : str, optional
        The sequence that it was drawn on (``"flair"``, ``"dwi"`` ...); None where not known.
    boundary_mm : float, optional
        Standard deviation of the drawn boundary, mm; None where not stated.
    notes : tuple of str
        What was done to the input on the way in ("resampled from a 2 mm grid").
    scale : str, optional
        What the graded map's values meant before they were scaled ("z from -4.1 to 0").

    Raises
    ------
    BywayError
        The effect volume is not on the template grid, holds NaN, or leaves [0, 1].

    Notes
    -----
    The arrays are taken as they are and must not be changed afterwards: what is derived from them is kept.
    """

    compartments: tuple[Compartment, ...] = ()
    effect_volume: NDArray[np.float32] | None = field(default=None, repr=False)
    drawn_on: str | None = None
    boundary_mm: float | None = None
    notes: tuple[str, ...] = ()
    scale: str | None = None

    def __post_init__(self) -> None:
        volume = self.effect_volume
        if volume is None:
            return
        if volume.shape != TEMPLATE_GRID.shape:
            raise BywayError(Fault("effect-volume", "lesion", f"an effect map of shape {volume.shape}",
                                   f"shape {TEMPLATE_GRID.shape}"))  # fmt: skip
        low, high = float(volume.min()), float(volume.max())
        if not (low >= 0.0 and high <= 1.0):  # also catches NaN
            raise BywayError(Fault("effect-volume", "lesion", f"effects from {low:g} to {high:g}",
                                   "effects between 0 and 1"))  # fmt: skip

    @classmethod
    def from_mask(
        cls, mask: NDArray[np.bool_], *, name: str = "lesion", kind: CompartmentKind = "core", effect: float = 1.0
    ) -> Lesion:
        """A lesion of one compartment.

        Examples
        --------
        >>> mask = np.zeros(TEMPLATE_GRID.shape, bool)
        >>> mask[100:110, 100:110, 100:110] = True
        >>> Lesion.from_mask(mask).volume_ml
        1.0
        """
        return cls((Compartment(name, kind, effect, mask),))

    @cached_property
    def effect_voxels(self) -> tuple[NDArray[np.int64], NDArray[np.float32]]:
        """C-order indices of the voxels with D > 0, ascending, and D there: the effect map without its zeros."""
        parts = [(_voxels_of(c.mask), np.float32(c.effect)) for c in self.compartments if c.effect > 0]
        if self.effect_volume is None and len(parts) == 1:
            voxels, effect = parts[0]
            return voxels, np.full(len(voxels), effect, np.float32)
        indices = [voxels for voxels, _ in parts]
        values = [np.full(len(voxels), effect, np.float32) for voxels, effect in parts]
        if self.effect_volume is not None:
            flat = self.effect_volume.reshape(-1)
            indices.append(np.flatnonzero(flat))
            values.append(flat[indices[-1]].astype(np.float32))
        if not indices:
            return np.empty(0, np.int64), np.empty(0, np.float32)
        # The largest effect at a voxel is the last of its run when sorted by voxel, then effect.
        every, effects = np.concatenate(indices), np.concatenate(values)
        order = np.lexsort((effects, every))
        every, effects = every[order], effects[order]
        last = np.ones(len(every), bool)
        last[:-1] = every[1:] != every[:-1]
        return every[last], effects[last]

    def effect_map(self) -> NDArray[np.float32]:
        """The effect map D in [0, 1] on the template grid: the largest effect of all that covers a voxel."""
        effect = np.zeros(TEMPLATE_GRID.size, np.float32)
        voxels, values = self.effect_voxels
        effect[voxels] = values
        return effect.reshape(TEMPLATE_GRID.shape)

    @property
    def mask(self) -> NDArray[np.bool_]:
        """Voxels where D > 0."""
        mask = np.zeros(TEMPLATE_GRID.size, bool)
        mask[self.effect_voxels[0]] = True
        return mask.reshape(TEMPLATE_GRID.shape)

    @property
    def is_empty(self) -> bool:
        """Whether no voxel is out of action."""
        return len(self.effect_voxels[0]) == 0

    @property
    def volume_ml(self) -> float:
        """Volume of all voxels with D > 0, in ml."""
        return len(self.effect_voxels[0]) * TEMPLATE_GRID.voxel_ml

    @property
    def volumes_ml(self) -> dict[str, float]:
        """Volume in ml by name of compartment; compartments may overlap."""
        volumes: dict[str, float] = {}
        for compartment in self.compartments:
            volumes[compartment.name] = volumes.get(compartment.name, 0.0) + compartment.volume_ml
        return volumes


def _voxels_of(mask: NDArray[np.bool_]) -> NDArray[np.int64]:
    """C-order indices of a mask's voxels; slices at both ends that hold none are passed over at once."""
    used = np.flatnonzero(mask.reshape(len(mask), -1).any(axis=1))
    if not len(used):
        return np.empty(0, np.int64)
    first = int(used[0])
    voxels: NDArray[np.int64] = np.flatnonzero(mask[first : int(used[-1]) + 1]) + first * mask[0].size
    return voxels
