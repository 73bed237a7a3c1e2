"""The course of a pathway on three slices: a grey picture of the slice, and lines to be drawn on it as SVG."""

from __future__ import annotations

import base64
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.cases.pictures import encode_png
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import template_volume

__all__ = ["INKS", "CourseView", "Line", "course_views"]

Plane = Literal["sagittal", "coronal", "axial"]
AXIS: dict[Plane, int] = {"sagittal": 0, "coronal": 1, "axial": 2}
# Okabe and Ito 2008, each with a dash pattern of its own, so that grey print tells segments apart.
INKS: tuple[tuple[str, str], ...] = (
    ("#e69f00", ""),
    ("#56b4e9", "6 2"),
    ("#009e73", "2 2"),
    ("#f0e442", "8 2 2 2"),
    ("#d55e00", "10 3"),
    ("#cc79a7", "1 2"),
    ("#0072b2", "4 4"),
    ("#ffffff", "12 2 2 2 2 2"),
)
NEAR_MM = 5.0
GREYS = 24


@dataclass(frozen=True)
class Line:
    """One stroke: SVG points, colour, dash pattern, width in pixels, and the segment that it belongs to."""

    points: str
    ink: str
    dash: str
    width: float
    segment: str


@dataclass(frozen=True)
class CourseView:
    """One slice with the strokes on it; the picture's left is the person's left (the back, on a sagittal slice)."""

    plane: Plane
    at_mm: int
    width: int
    height: int
    data_uri: str
    lines: tuple[Line, ...]

    @property
    def axis(self) -> str:
        """The axis letter that ``at_mm`` counts along."""
        return "xyz"[AXIS[self.plane]]


def course_views(courses: Mapping[str, NDArray[np.floating]], segments: Sequence[str]) -> tuple[CourseView, ...]:
    """Three slices through the middle of a pathway.

    Parameters
    ----------
    courses : mapping of element id to (n, 3) array
        Core lines, MNI mm.
    segments : sequence of str
        Keys of the pathway's segments, in the order of the inks.

    Returns
    -------
    tuple of CourseView
        Sagittal (through the left or the midline copy), coronal, axial; empty if no course is known.
    """
    own = {element: line for element, line in courses.items() if element.partition("@")[0] in segments}
    seen = [line for element, line in own.items() if not element.endswith("@right")]
    if not seen:
        return ()
    middle = np.rint(np.median(np.concatenate(seen), axis=0)).astype(int)
    planes: tuple[Plane, ...] = ("sagittal", "coronal", "axial")
    return tuple(_view(plane, int(middle[AXIS[plane]]), own, segments) for plane in planes)


def _view(plane: Plane, at_mm: int, courses: Mapping[str, NDArray[np.floating]], segments: Sequence[str]) -> CourseView:
    axis = AXIS[plane]
    uri, width, height = _slice(plane, at_mm)
    lines: list[Line] = []
    for element, course in courses.items():
        segment = element.partition("@")[0]
        if axis == 0 and element.endswith("@right"):
            continue
        ink, dash = INKS[segments.index(segment) % len(INKS)]
        pixels = _pixels(course, axis, height)
        lines.append(Line(_points(pixels), ink, dash, 0.8, segment))
        near = np.abs(np.asarray(course)[:, axis] - at_mm) <= NEAR_MM
        for start, stop in _stretches(near):
            lines.append(Line(_points(pixels[start:stop]), ink, dash, 3.0, segment))
    return CourseView(plane, at_mm, width, height, uri, tuple(lines))


@lru_cache(maxsize=64)
def _slice(plane: Plane, at_mm: int) -> tuple[str, int, int]:
    """The template's slice as a data address, with its width and height in pixels."""
    axis = AXIS[plane]
    index = int(np.clip(round(at_mm - TEMPLATE_GRID.affine[axis, 3]), 0, TEMPLATE_GRID.shape[axis] - 1))
    grey = np.take(template_volume("t1"), index, axis=axis).T[::-1]
    steps = np.rint(np.clip(grey, 0, 1) * (GREYS - 1)) * (255 // (GREYS - 1))
    pixels = np.repeat(steps.astype(np.uint8)[..., None], 3, axis=2)
    uri = "data:image/png;base64," + base64.b64encode(encode_png(pixels)).decode("ascii")
    return uri, pixels.shape[1], pixels.shape[0]


def _pixels(course: NDArray[np.floating], axis: int, height: int) -> NDArray[np.float64]:
    """Points of a course in pixels of the slice, x to the right and y downward."""
    voxels = np.delete(TEMPLATE_GRID.to_voxel(np.asarray(course, float)), axis, axis=1)
    return np.stack([voxels[:, 0] + 0.5, height - 0.5 - voxels[:, 1]], axis=1)


def _stretches(near: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Runs of points near the slice, at least two points long."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], near, [False]]).astype(int)))
    return [(int(a), int(b)) for a, b in zip(edges[::2], edges[1::2], strict=True) if b - a >= 2]


def _points(pixels: NDArray[np.float64]) -> str:
    step = max(1, len(pixels) // 40)
    kept = [*range(0, len(pixels) - 1, step), len(pixels) - 1]
    return " ".join(f"{x:.1f},{y:.1f}" for x, y in pixels[kept])
