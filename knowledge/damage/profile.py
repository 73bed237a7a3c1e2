"""Along-course profile: where along a segment the damage sits."""

from __future__ import annotations

from typing import Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from byway.knowledge.damage.point import effect_voxels
from byway.knowledge.faults import BywayError, Fault, nearest
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.space.geometry import Geometry

__all__ = ["PROFILE_COLUMNS", "PROFILE_FACTS", "course_profile", "profile_facts"]

PROFILE_COLUMNS = ("from_start_mm", "from_end_mm", "share_hit", "mean_effect", "streamlines")

PROFILE_FACTS = (
    "length_mm",
    "hit_from_start_mm",
    "hit_from_end_mm",
    "hit_length_mm",
    "peak_share",
    "peak_from_start_mm",
    "peak_from_end_mm",
)


class HasGeometry(Protocol):
    """A template, or anything else that holds a geometry."""

    @property
    def geometry(self) -> Geometry:
        """Parcels and bundles."""
        ...


def course_profile(
    lesion: Lesion | NDArray[np.floating],
    template: Geometry | HasGeometry,
    key: str,
    side: str | None = None,
    *,
    bin_mm: float = 1.0,
) -> pd.DataFrame:
    """Share of a segment's streamlines that the lesion meets, by distance from the segment's ends.

    Parameters
    ----------
    lesion : Lesion or effect map
        The lesion.
    template : Geometry, or what holds one
        Bundles, ordered from the segment's first place to its second.
    key : str
        ``pathway.segment``, or the whole element id with ``side`` left out.
    side : {'left', 'right', 'midline'}, optional
        Side; the midline where None and the key has none.
    bin_mm : float
        Width of a bin.

    Returns
    -------
    DataFrame
        One row a bin, from the first place to the second: ``from_start_mm`` and ``from_end_mm`` (middle of the bin),
        ``share_hit`` (share of streamlines, by weight, with D > 0 in the bin), ``mean_effect`` (mean over streamlines
        of the largest D in the bin), ``streamlines`` (how many reach into the bin). ``attrs`` holds the element id
        and the length in mm.

    Raises
    ------
    BywayError
        The segment is not known, or has no streamline of two points.

    Notes
    -----
    Streamlines differ in length. Each is laid on the median length of the core streamlines by its own share of arc
    length, so that the ends meet; a bin of a long streamline therefore covers a little more of it.
    """
    geometry = template if isinstance(template, Geometry) else template.geometry
    element = key if "@" in key else f"{key}@{side or 'midline'}"
    if element not in geometry.segment_ids:
        raise BywayError(Fault("unknown-segment", element, "no such segment",
                               remedy=nearest(element, geometry.segment_ids)))  # fmt: skip
    if not bin_mm > 0:
        raise BywayError(Fault("bin", "profile", f"bins of {bin_mm} mm", "more than 0 mm"))
    segment = geometry.segment_ids.index(element)
    first, last = (int(n) for n in geometry.segment_offsets[segment : segment + 2])
    bounds = geometry.streamline_offsets[first : last + 1]
    points = np.asarray(geometry.points_mm[bounds[0] : bounds[-1]], float)
    starts = bounds[:-1] - bounds[0]
    line = np.repeat(np.arange(last - first), np.diff(bounds))

    step = np.zeros(len(points))
    step[1:] = np.linalg.norm(np.diff(points, axis=0), axis=1)
    step[starts[starts < len(points)]] = 0
    run = np.cumsum(step)
    along = run - run[starts][line]
    length = np.bincount(line, step, minlength=last - first)
    sound = (length > 0) & (geometry.core[first:last] | ~geometry.core[first:last].any())
    if not sound.any():
        raise BywayError(Fault("streamlines", element, "no streamline of two points"))
    course_mm = float(np.median(length[sound]))
    bins = max(1, int(np.ceil(course_mm / bin_mm)))
    with np.errstate(invalid="ignore"):
        place = np.where(length[line] > 0, along / length[line], 0.0) * course_mm
    bin_of_point = np.minimum((place / bin_mm).astype(int), bins - 1)

    met = _effect_at(lesion, geometry, points)
    cell = line * bins + bin_of_point
    largest = np.zeros((last - first) * bins)
    order = np.argsort(met, kind="stable")
    largest[cell[order]] = met[order]  # ascending, so that the largest stays
    reached = np.zeros(largest.size, bool)
    reached[cell] = True
    weight = geometry.streamline_weights[first:last].astype(float)[:, None]
    by_line, there = largest.reshape(-1, bins), reached.reshape(-1, bins)
    whole = (weight * there).sum(axis=0)
    middle = (np.arange(bins) + 0.5) * bin_mm
    middle[-1] = ((bins - 1) * bin_mm + course_mm) / 2
    with np.errstate(invalid="ignore", divide="ignore"):
        table = pd.DataFrame(
            {
                "from_start_mm": middle,
                "from_end_mm": course_mm - middle,
                "share_hit": (weight * (by_line > 0)).sum(axis=0) / whole,
                "mean_effect": (weight * by_line).sum(axis=0) / whole,
                "streamlines": there.sum(axis=0),
            },
            columns=list(PROFILE_COLUMNS),
        )
    table.attrs.update(element=element, length_mm=course_mm)
    return table


def profile_facts(profile: pd.DataFrame) -> dict[str, float]:
    """A profile in seven numbers.

    Parameters
    ----------
    profile : DataFrame
        From :func:`course_profile`.

    Returns
    -------
    dict
        ``length_mm`` of the course; ``hit_from_start_mm`` and ``hit_from_end_mm``, from each end to the first bin
        that is hit; ``hit_length_mm`` between the two; ``peak_share``, the largest share hit in any bin, and its
        place from each end (of several the first). NaN where nothing is hit, but for the length and the peak of 0.

    Examples
    --------
    >>> table = pd.DataFrame({"from_start_mm": [0.5, 1.5, 2.5], "from_end_mm": [2.5, 1.5, 0.5],
    ...                       "share_hit": [0.0, 0.25, 0.0]})
    >>> table.attrs["length_mm"] = 3.0
    >>> facts = profile_facts(table)
    >>> facts["hit_from_start_mm"], facts["hit_from_end_mm"], facts["hit_length_mm"], facts["peak_from_end_mm"]
    (1.0, 1.0, 1.0, 1.5)
    """
    length = float(profile.attrs["length_mm"])
    share = profile["share_hit"].fillna(0.0).to_numpy()
    hit = np.flatnonzero(share > 0)
    if len(hit) == 0:
        return {**dict.fromkeys(PROFILE_FACTS, float("nan")), "length_mm": length, "peak_share": 0.0}
    middle = profile["from_start_mm"].to_numpy()
    between = (middle[:-1] + middle[1:]) / 2
    edges = np.concatenate([[0.0], between, [length]])
    if len(middle) > 2:  # bins are equally wide but for the last
        edges[1:-1] = np.arange(1, len(middle)) * (middle[1] - middle[0])
    start, end = float(edges[hit[0]]), float(edges[hit[-1] + 1])
    peak = int(share.argmax())
    return {
        "length_mm": length,
        "hit_from_start_mm": start,
        "hit_from_end_mm": length - end,
        "hit_length_mm": end - start,
        "peak_share": float(share[peak]),
        "peak_from_start_mm": float(middle[peak]),
        "peak_from_end_mm": length - float(middle[peak]),
    }


def _effect_at(
    lesion: Lesion | NDArray[np.floating], geometry: Geometry, points: NDArray[np.floating]
) -> NDArray[np.float32]:
    """D at the voxel of each point."""
    voxels, effects = effect_voxels(lesion)
    if len(voxels) == 0:
        return np.zeros(len(points), np.float32)
    flat = geometry.grid.flat_index(points)
    at = np.minimum(np.searchsorted(voxels, flat), len(voxels) - 1)
    return np.where(voxels[at] == flat, effects[at], np.float32(0))
