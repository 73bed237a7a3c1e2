"""Coverage: where the graph has no segment. No entry there does not mean that there is no tract."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import effect_voxels
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.space.template import template_volume

__all__ = ["WHITE_MATTER", "uncharted_map", "uncharted_share", "white_matter"]

WHITE_MATTER = 0.5


def white_matter() -> NDArray[np.bool_]:
    """Voxels of the template whose probability of white matter is at least one half."""
    return np.asarray(template_volume("wm") >= WHITE_MATTER)


def uncharted_map(index: DamageIndex) -> NDArray[np.bool_]:
    """White matter of the template that lies in no segment of the graph, to be shown on slices."""
    return white_matter() & ~index.charted


def uncharted_share(
    lesion: Lesion | NDArray[np.floating], index: DamageIndex, *, within: NDArray[np.bool_] | None = None
) -> float:
    """Share of the lesion's white matter that lies in no segment of the graph.

    Parameters
    ----------
    lesion : Lesion or effect map
        Voxels with D > 0 count, whatever D is.
    index : DamageIndex
        Geometry of the graph's segments.
    within : bool array, optional
        What is white matter; the template's where None.

    Returns
    -------
    float
        In [0, 1]; NaN where the lesion holds no white matter, so that there is nothing of which to take a share.
    """
    voxels, _ = effect_voxels(lesion)
    white = (white_matter() if within is None else within).reshape(-1)[voxels]
    if not white.any():
        return float("nan")
    return float(np.mean(~index.charted.reshape(-1)[voxels[white]]))
