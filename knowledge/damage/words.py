"""The effect map under every variant and boundary shift, packed into one word a voxel.

A word holds a run of bits for each variant; bit ``k`` of a run says that D is at least the variant's ``k``-th level.
The largest D along a streamline is then the bitwise OR of its words: one gather answers all variants, exactly.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.lesion.distance import LevelSet

__all__ = ["MOST_LEVELS", "VARIANTS", "EffectWords", "effect_levels"]

VARIANTS = ("as_drawn", "too_small", "too_large", "perilesional")
MOST_LEVELS = 15


def effect_levels(effects: NDArray[np.floating]) -> NDArray[np.float32]:
    """Distinct effects above 0, ascending: all where there are at most 15, else 15 evenly spaced from 1/15 to 1.

    Examples
    --------
    >>> effect_levels(np.array([0.25, 1.0, 0.25])).tolist()
    [0.25, 1.0]
    """
    distinct = np.unique(effects[effects > 0]).astype(np.float32)
    if len(distinct) <= MOST_LEVELS:
        return distinct
    return (np.arange(1, MOST_LEVELS + 1) / MOST_LEVELS).astype(np.float32)


@dataclass(frozen=True, eq=False)
class EffectWords:
    """Word volumes, one for each boundary shift.

    Parameters
    ----------
    origin : (3,) int array
        Voxel index of the box's first voxel on the grid.
    volumes : tuple of unsigned integer arrays
        One for each shift, all of the box's shape.
    levels : dict of variant to float32 array
        Levels of each variant, ascending.
    first_bit : dict of variant to int
        Lowest bit of each variant's run.
    """

    origin: NDArray[np.int64] = field(repr=False)
    volumes: tuple[NDArray[np.unsignedinteger], ...] = field(repr=False)
    levels: dict[str, NDArray[np.float32]]
    first_bit: dict[str, int]

    @classmethod
    def build(
        cls,
        ijk: NDArray[np.integer],
        effects: NDArray[np.float32],
        shifts: Sequence[float],
        *,
        departure: float,
        rim: float,
        rim_effect: float,
    ) -> EffectWords:
        """Pack a lesion.

        Parameters
        ----------
        ijk : (L, 3) int array
            Voxels of the lesion, at least one.
        effects : (L,) float32
            D there.
        shifts : sequence of float
            Displacements of the drawn edge, voxels, positive outwards.
        departure : float
            By how much more the edge moves in ``too_small`` (out) and ``too_large`` (in), voxels.
        rim : float
            Width of the tissue around the lesion that is out of action in ``perilesional``, voxels.
        rim_effect : float
            Effect of that rim, in (0, 1].
        """
        most, least = max(0.0, *shifts), min(0.0, *shifts)
        out, inward = most + max(departure, rim), departure - least
        margin = int(np.ceil(out + 0.5))
        origin = ijk.min(axis=0) - margin
        box = tuple(int(n) for n in ijk.max(axis=0) + margin + 1 - origin)
        effect = np.zeros(box, np.float32)
        effect[tuple((ijk - origin).T)] = effects

        levels = effect_levels(effects)
        # Effects are matched to the nearest level; the lowest takes all that is below it.
        step = np.concatenate([[0.0], (levels[:-1] + levels[1:]) / 2]).astype(np.float32)
        sets = [LevelSet(effect > at if k == 0 else effect >= at, out, inward) for k, at in enumerate(step)]
        around = np.unique(np.append(levels, np.float32(rim_effect)))
        run = {name: around if name == "perilesional" else levels for name in VARIANTS}
        bits = np.cumsum([0, *(len(run[name]) for name in VARIANTS)])
        first_bit = dict(zip(VARIANTS, (int(b) for b in bits[:-1]), strict=True))
        dtype = np.min_scalar_type(2 ** int(bits[-1]) - 1)
        moves = {"as_drawn": 0.0, "too_small": departure, "too_large": -departure, "perilesional": 0.0}
        volumes = []
        for shift in shifts:
            word = np.zeros(box, dtype)
            for name in VARIANTS:
                masks = [one.moved(shift + moves[name], keep_some=True) for one in sets]
                reached = list(zip(levels, masks, strict=True))
                if name == "perilesional":
                    reached.append((np.float32(rim_effect), sets[0].moved(shift + rim)))
                for value, mask in reached:
                    # All levels up to this one, so that runs stay unbroken whatever was shifted.
                    below = int(np.searchsorted(run[name], value, side="right"))
                    word[mask] |= dtype.type(((1 << below) - 1) << first_bit[name])
            volumes.append(word)
        return cls(origin, tuple(volumes), run, first_bit)

    def decoded(self, words: NDArray[np.unsignedinteger], variant: str) -> NDArray[np.float32]:
        """D of one variant for each word."""
        if words.dtype.itemsize <= 2:
            every = np.arange(np.iinfo(words.dtype).max + 1, dtype=words.dtype)
            return np.asarray(self._unpacked(every, variant)[words])
        return self._unpacked(words, variant)

    def _unpacked(self, words: NDArray[np.unsignedinteger], variant: str) -> NDArray[np.float32]:
        levels = np.concatenate([[np.float32(0)], self.levels[variant]]).astype(np.float32)
        n_bits = len(levels) - 1
        run = (words >> words.dtype.type(self.first_bit[variant])) & words.dtype.type((1 << n_bits) - 1)
        return np.asarray(levels[np.bitwise_count(run)])
