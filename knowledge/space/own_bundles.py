"""A person's bundles in the place of the template's: led to template space, oriented, cut at planes, weighed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import Fault, ImageError
from byway.knowledge.space.curves import resample
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.mapping import MappingRow, Plane
from byway.knowledge.space.template import brain_mask
from byway.knowledge.space.tractograms import read_tractogram
from byway.knowledge.space.transforms import Transform

__all__ = ["OwnSegment", "core_of", "cut_between", "own_bundle"]

_INSIDE_SHARE = 0.5
_CORE_SHARE = 0.4
_SHAPE_POINTS = 24


@dataclass(frozen=True)
class OwnSegment:
    """Streamlines (template mm, in the segment's direction) that replace a segment's, and what was left out."""

    streamlines: list[NDArray[np.float32]]
    core: NDArray[np.bool_]
    weights: NDArray[np.float32]
    core_line: NDArray[np.float32]
    notes: tuple[str, ...] = ()


def own_bundle(row: MappingRow, course_mm: NDArray[np.floating], to_template: Transform | None) -> OwnSegment:
    """Streamlines of one row of a mapping table.

    Parameters
    ----------
    row : MappingRow
        File, element, and planes that cut it.
    course_mm : (n, 3) float
        Core line of the template's segment: only its direction is used, to say which end of a streamline is the
        first. A streamline has no direction of its own.
    to_template : Transform or None
        From the file's mm to template mm; None where the file is in template space.

    Raises
    ------
    ImageError
        Faults of the file; fewer than half of the points inside the template's brain; no streamline that crosses
        the planes.
    """
    read = read_tractogram(row.path)
    notes = list(read.notes)
    lines = [_moved(line, to_template) for line in read.streamlines]
    _refuse_elsewhere(row, lines, moved=to_template is not None)
    sound = [line for line in lines if len(line) > 1 and np.isfinite(line).all()]
    if len(sound) < len(lines):
        notes.append(f"{row.path.name}: {len(lines) - len(sound)} streamlines leave the displacement field; left out")
    lines = [_oriented(line, course_mm) for line in sound]
    if row.from_plane is not None or row.to_plane is not None:
        parts = [cut_between(line, row.from_plane, row.to_plane) for line in lines]
        lines = [part for part in parts if part is not None]
        notes.append(f"{row.path.name}: {len(lines)} of {len(parts)} streamlines cross the planes of {row.element}")
    if not lines:
        raise ImageError(
            Fault(
                "own-none-left",
                row.where,
                f"no streamline of {row.path.name} is left for {row.element}",
                "streamlines that cross both planes",
                "check the planes",
            )
        )
    streamlines = [resample(line).astype(np.float32) for line in lines]
    core, middle = core_of(streamlines)
    return OwnSegment(streamlines, core, np.ones(len(streamlines), np.float32), streamlines[middle], tuple(notes))


def _moved(line: NDArray[np.float32], to_template: Transform | None) -> NDArray[np.float64]:
    return np.asarray(line, float) if to_template is None else to_template.apply(line)


def _refuse_elsewhere(row: MappingRow, lines: list[NDArray[np.float64]], *, moved: bool) -> None:
    points = np.concatenate(lines)
    flat = TEMPLATE_GRID.flat_index(np.nan_to_num(points, nan=1e4))
    inside = float(brain_mask().reshape(-1)[flat[flat >= 0]].sum()) / len(points)
    if inside < _INSIDE_SHARE:
        raise ImageError(
            Fault(
                "own-elsewhere",
                row.where,
                f"{inside:.0%} of the points of {row.path.name} lie in the template's brain",
                "at least 50 %",
                "check the transform and its direction" if moved else "give the transform to template space",
            )
        )


def _oriented(line: NDArray[np.float64], course_mm: NDArray[np.floating]) -> NDArray[np.float64]:
    course = np.asarray(course_mm, float)
    along = np.linalg.norm(line[0] - course[0]) + np.linalg.norm(line[-1] - course[-1])
    against = np.linalg.norm(line[-1] - course[0]) + np.linalg.norm(line[0] - course[-1])
    return line[::-1] if against < along else line


def cut_between(
    line: NDArray[np.floating], first: Plane | None, second: Plane | None
) -> NDArray[np.float64] | None:  # fmt: skip
    """The part of a streamline from its crossing of one plane to its next crossing of another.

    Parameters
    ----------
    line : (n, 3) float
        Streamline in template mm.
    first, second : Plane or None
        None stands for the streamline's own end on that side. Of several crossings of the first plane the last
        before the second plane counts.

    Returns
    -------
    (m, 3) float or None
        Both ends lie in the planes; None if a plane is not crossed in this order.

    Examples
    --------
    >>> line = np.array([[0.0, 0, 0], [0, 10, 0]])
    >>> cut_between(line, Plane(np.array([0.0, 2, 0]), np.array([0.0, 1, 0])), None)[:, 1].tolist()
    [2.0, 10.0]
    """
    points = np.asarray(line, float)
    starts = [0.0] if first is None else _crossings(points, first)
    ends = [len(points) - 1.0] if second is None else _crossings(points, second)
    for end in ends:
        before = [start for start in starts if start < end]
        if before:
            start = before[-1]
            inner = points[int(np.floor(start)) + 1 : int(np.ceil(end))]
            return np.concatenate([_at(points, start)[None], inner, _at(points, end)[None]])
    return None


def _crossings(points: NDArray[np.float64], plane: Plane) -> list[float]:
    side = plane.side_of(points)
    found = np.flatnonzero((side[:-1] < 0) != (side[1:] < 0))
    return [float(i + side[i] / (side[i] - side[i + 1])) for i in found]


def _at(points: NDArray[np.float64], position: float) -> NDArray[np.float64]:
    i = min(int(position), len(points) - 2)
    return np.asarray(points[i] + (position - i) * (points[i + 1] - points[i]))


def core_of(streamlines: list[NDArray[np.float32]]) -> tuple[NDArray[np.bool_], int]:
    """Core of a bundle of oriented streamlines: the 40 % nearest to the rest in shape; and the most central one.

    Shape is 24 points at equal distances; nearness is the mean distance to the bundle's mean shape.
    """
    shapes = np.array([_shape(line) for line in streamlines])
    away = np.linalg.norm(shapes - np.median(shapes, axis=0), axis=2).mean(axis=1)
    rank = np.argsort(np.argsort(away, kind="stable"), kind="stable")
    return rank < max(1, int(np.ceil(_CORE_SHARE * len(streamlines)))), int(np.argmin(away))


def _shape(line: NDArray[np.float32]) -> NDArray[np.float64]:
    along = np.concatenate([[0.0], np.cumsum(np.linalg.norm(np.diff(line, axis=0), axis=1))])
    wanted = np.linspace(0.0, along[-1], _SHAPE_POINTS)
    return np.column_stack([np.interp(wanted, along, line[:, axis]) for axis in range(3)])
