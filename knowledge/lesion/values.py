"""A survey of the values in an image, slab by slab, without a second copy of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["Values", "survey"]

_SLAB_VOXELS = 4_000_000
_MOST_DISTINCT = 4096
_WHOLE = 1e-5


@dataclass(frozen=True)
class Values:
    """What values an image holds, after slope and intercept.

    Parameters
    ----------
    least, most : float
        Of the finite values.
    broken : int
        Voxels that are NaN or infinite.
    nonzero : int
        Finite voxels that are not 0.
    counts : dict of float to int, or None
        Voxels of each distinct value that is not 0, ascending; None where there are too many to be labels.
    stored : dict of float to list
        The values as stored that become each of those.
    whole : bool
        Whether all values are whole numbers.
    """

    least: float
    most: float
    broken: int
    nonzero: int
    counts: dict[float, int] | None
    stored: dict[float, list[Any]]
    whole: bool


def survey(voxels: NDArray[Any], slope: float = 1.0, inter: float = 0.0) -> Values:
    """Survey stored voxels whose values are ``stored * slope + inter``.

    Examples
    --------
    >>> found = survey(np.array([[[0, 2], [2, 5]]]))
    >>> found.counts, found.whole
    ({2.0: 2, 5.0: 1}, True)
    """
    slope, inter = float(slope), float(inter)
    per_slab = max(1, _SLAB_VOXELS // max(1, voxels[..., 0].size))
    seen: dict[Any, int] | None = {}
    least, most, broken, nonzero, whole = np.inf, -np.inf, 0, 0, True
    for first in range(0, voxels.shape[-1], per_slab):
        slab = np.asarray(voxels[..., first : first + per_slab])
        if slab.dtype.kind == "f":
            finite = np.isfinite(slab)
            if not finite.all():
                broken += int(np.count_nonzero(~finite))
                slab = slab[finite]
        if slab.size == 0:
            continue
        ends = _told(float(slab.min()) * slope + inter), _told(float(slab.max()) * slope + inter)
        least, most = min(least, *ends), max(most, *ends)
        background = _stored_zero(slope, inter, slab.dtype)
        other = slab if background is None else slab[slab != background]
        nonzero += int(other.size)
        if slab.dtype.kind == "f" or slope % 1 or inter % 1:
            told = other.astype(np.float64) * slope + inter
            whole = whole and bool((np.abs(told - np.rint(told)) < _WHOLE).all())
        if seen is not None and other.size:
            seen = _counted(other, seen)
    if seen is None or broken:
        return Values(least, most, broken, nonzero, None, {}, whole)
    counts: dict[float, int] = {}
    stored: dict[float, list[Any]] = {}
    for raw in sorted(seen, key=lambda raw: float(raw) * slope + inter):
        value = _told(float(raw) * slope + inter)
        counts[value] = counts.get(value, 0) + seen[raw]
        stored.setdefault(value, []).append(raw)
    return Values(least, most, broken, nonzero, counts, stored, whole)


def _stored_zero(slope: float, inter: float, dtype: np.dtype[Any]) -> Any:
    """The stored value that means 0, or None where no stored value does."""
    if inter == 0:
        return dtype.type(0)
    zero = -inter / slope
    if dtype.kind == "f":
        return dtype.type(zero)
    limits, nearest = np.iinfo(dtype), round(zero)
    is_zero = _told(nearest * slope + inter) == 0 and limits.min <= nearest <= limits.max
    return dtype.type(nearest) if is_zero else None


def _told(value: float) -> float:
    """A value, or the whole number that it misses only because headers keep slopes in single precision."""
    return float(round(value)) if abs(value - round(value)) < _WHOLE else value


def _counted(values: NDArray[Any], seen: dict[Any, int]) -> dict[Any, int] | None:
    """Add the counts of a slab; None once there are too many distinct values to be labels."""
    first = values.flat[0]
    if (values == first).all():  # the usual case, a mask, costs no sorting
        seen[first.item()] = seen.get(first.item(), 0) + values.size
    else:
        distinct, counts = np.unique(values, return_counts=True)
        if len(distinct) > _MOST_DISTINCT:
            return None
        for raw, count in zip(distinct.tolist(), counts.tolist(), strict=True):
            seen[raw] = seen.get(raw, 0) + count
    return seen if len(seen) <= _MOST_DISTINCT else None
