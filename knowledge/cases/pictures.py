"""Slices of the template with the lesion on them, as small PNG files for the report; readable in black and white.

The lesion is hatched as well as tinted, a pattern for each compartment, so that a printed grey copy still tells them
apart. Neurological display: the picture's left is the person's left, and L and R stand on it (the report writes them).
"""

from __future__ import annotations

import base64
import struct
import zlib
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import template_volume

__all__ = ["SliceStrip", "SliceView", "encode_png", "lesion_slices", "slice_views"]

Plane = Literal["axial", "coronal", "sagittal"]
AXIS: dict[Plane, int] = {"axial": 2, "coronal": 1, "sagittal": 0}
# Okabe and Ito 2008: vermillion, blue, bluish green.
TINTS = {"core": (213, 94, 0), "oedema": (0, 114, 178), "other": (0, 158, 115)}


@dataclass(frozen=True)
class SliceView:
    """One slice: plane, its coordinate in MNI mm, size in pixels, and the picture as a data address."""

    plane: Plane
    at_mm: float
    width: int
    height: int
    data_uri: str

    @property
    def axis(self) -> str:
        """The axis letter that ``at_mm`` counts along."""
        return "xyz"[AXIS[self.plane]]


def encode_png(pixels: NDArray[np.uint8]) -> bytes:
    """A (height, width, 3) uint8 array as PNG (ISO/IEC 15948): 8-bit RGB, no interlace, filter 0."""
    height, width, _ = pixels.shape

    def chunk(kind: bytes, data: bytes) -> bytes:
        return struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data))

    rows = np.concatenate([np.zeros((height, 1), np.uint8), pixels.reshape(height, width * 3)], axis=1)
    head = struct.pack(">IIBBBBB", width, height, 8, 2, 0, 0, 0)
    return (
        b"\x89PNG\r\n\x1a\n"
        + chunk(b"IHDR", head)
        + chunk(b"IDAT", zlib.compress(rows.tobytes(), 9))
        + chunk(b"IEND", b"")
    )


def _cut(volume: NDArray[np.generic], plane: Plane, index: int) -> NDArray[np.generic]:
    """A slice with rows from top to bottom and columns from the person's left (or back) to right (or front)."""
    cut: NDArray[np.generic] = np.take(volume, index, axis=AXIS[plane]).T[::-1]
    return cut


def _hatch(shape: tuple[int, ...], kind: str) -> NDArray[np.bool_]:
    rows, columns = np.indices(shape)
    if kind == "core":
        return np.asarray((rows + columns) % 4 == 0)
    if kind == "oedema":
        return np.asarray((rows % 4 == 0) & (columns % 4 == 0))
    return np.asarray(rows % 4 == 0)


def _paint(background: NDArray[np.generic], lesion: Lesion, plane: Plane, index: int) -> NDArray[np.uint8]:
    grey = np.asarray(background, float)
    picture = np.repeat((255 * np.clip(grey, 0, 1))[..., None], 3, axis=2)
    layers = [(c.kind, _cut(c.mask, plane, index).astype(bool)) for c in lesion.compartments]
    if lesion.effect_volume is not None:
        layers.append(("other", np.asarray(_cut(lesion.effect_volume, plane, index), float) > 0))
    for kind, mask in reversed(layers):  # the first compartment, the core, on top
        tint = np.array(TINTS[kind], float)
        picture[mask] = 0.45 * picture[mask] + 0.55 * tint
        picture[mask & _hatch(mask.shape, kind)] = tint * 0.25
    return picture.astype(np.uint8)


def slice_views(background: NDArray[np.floating], lesion: Lesion, extra: int = 2) -> list[SliceView]:
    """Slices through the middle of the lesion in three planes, and ``extra`` axial ones above and below.

    Parameters
    ----------
    background : float array on the template grid, in [0, 1]
        What to draw behind, for instance the template's T1.
    lesion : Lesion
        What to draw on it; an empty lesion is drawn at the grid's origin.
    extra : int
        Further axial slices, spread over the height of the lesion.
    """
    where = np.argwhere(lesion.mask)
    middle = np.rint(np.median(where, axis=0) if len(where) else TEMPLATE_GRID.to_voxel(np.zeros((1, 3)))[0]).astype(
        int
    )
    cuts: list[tuple[Plane, int]] = [(plane, int(middle[AXIS[plane]])) for plane in ("axial", "coronal", "sagittal")]
    if len(where) and extra:
        heights = np.quantile(where[:, 2], np.linspace(0.1, 0.9, extra)).astype(int)
        cuts += [("axial", int(z)) for z in heights if abs(int(z) - middle[2]) > 2]
    views = []
    for plane, index in cuts:
        pixels = _paint(_cut(background, plane, index), lesion, plane, index)
        at = float(TEMPLATE_GRID.to_mm(np.full((1, 3), index))[0, AXIS[plane]])
        uri = "data:image/png;base64," + base64.b64encode(encode_png(pixels)).decode("ascii")
        views.append(SliceView(plane, at, pixels.shape[1], pixels.shape[0], uri))
    return views


@dataclass(frozen=True)
class SliceStrip:
    """Slices side by side; in a notebook it shows itself, with L and R written on every picture that has sides."""

    views: tuple[SliceView, ...]

    def _repr_html_(self) -> str:
        letter = "position:absolute;top:2px;color:#fff;font-weight:700;text-shadow:0 0 3px #000;"
        figures = []
        for view in self.views:
            words = f"{view.plane}, {view.axis} = {view.at_mm:g} mm"
            sides = "" if view.plane == "sagittal" else (
                f'<span style="{letter}left:5px">L</span><span style="{letter}right:5px">R</span>')  # fmt: skip
            figures.append(
                f'<figure style="margin:0;width:180px;position:relative"><img src="{view.data_uri}" alt="{words}" '
                f'style="width:180px;background:#000">{sides}<figcaption>{words}</figcaption></figure>'
            )
        return f'<div style="display:flex;flex-wrap:wrap;gap:12px;align-items:end">{"".join(figures)}</div>'

    def __repr__(self) -> str:
        return "; ".join(f"{view.plane}, {view.axis} = {view.at_mm:g} mm" for view in self.views)


def lesion_slices(lesion: Lesion, extra: int = 0) -> SliceStrip:
    """Slices of the template through a lesion, for a notebook: see :func:`slice_views`."""
    return SliceStrip(tuple(slice_views(template_volume("t1"), lesion, extra)))
