"""Where elements lie in fact, in the form in which the graph's checks ask for it."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.space.atlas import Template

__all__ = ["geometry_ends"]


def geometry_ends(template: Template) -> dict[str, NDArray[np.float64]]:
    """Points of every parcel, and both ends of every core line, by element id.

    Parameters
    ----------
    template : Template
        Geometry of the graph that is to be checked.

    Returns
    -------
    dict of str to float64 array
        Region ids with (n, 3) voxel centres, segment ids with (2, 3) ends, MNI mm: what
        :func:`~byway.knowledge.graph.checks.check_graph` takes as ``geometry_ends``.
    """
    geometry = template.geometry
    ends: dict[str, NDArray[np.float64]] = {}
    for i, element in enumerate(geometry.region_ids):
        voxels = np.stack(np.unravel_index(geometry.parcel_voxels(i), geometry.grid.shape), axis=1)
        ends[element] = geometry.grid.to_mm(voxels)
    for element, line in template.core_lines.items():
        ends[element] = np.asarray(line[[0, -1]], np.float64)
    return ends
