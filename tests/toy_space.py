"""A small invented geometry on the template grid, so that damage can be tested without building the template."""

from __future__ import annotations

import hashlib

import numpy as np

from byway.knowledge.space.geometry import Geometry
from byway.knowledge.space.grid import TEMPLATE_GRID

__all__ = ["label_layers", "toy_geometry"]


def _tube(rng, start, end, bend, n_streamlines, radius):
    """Streamlines about a bent curve from start to end, points at most 1 mm apart."""
    lines, core = [], []
    length = np.linalg.norm(np.subtract(end, start)) + 2 * np.linalg.norm(bend)
    t = np.linspace(0, 1, int(np.ceil(length * 1.3)) + 2)[:, None]
    curve = (1 - t) * start + t * end + 4 * t * (1 - t) * np.asarray(bend)
    for _ in range(n_streamlines):
        shift = rng.normal(size=3)
        shift *= radius * rng.random() ** (1 / 3) / np.linalg.norm(shift)
        lines.append((curve + shift).astype(np.float32))
        core.append(np.linalg.norm(shift) < 0.6 * radius)
    core[0] = True
    return lines, core


def toy_geometry(n_pairs: int = 4, n_streamlines: int = 40, seed: int = 0, radius_mm: float = 4.0) -> Geometry:
    """Mirrored pairs of bent tubes and of spherical parcels with exact mirror symmetry about x = 0.

    Parameters
    ----------
    n_pairs : int
        Pairs of segments (``tube.n@left``, ``tube.n@right``) and of regions (``ball_n@...``).
    n_streamlines : int
        Streamlines of each segment.
    """
    rng = np.random.default_rng(seed)
    grid = TEMPLATE_GRID
    region_ids, segment_ids, parcels, weights, bundles, cores = [], [], [], [], [], []
    axes = [np.arange(n) * 1.0 + grid.affine[a, 3] for a, n in enumerate(grid.shape)]
    claimed = np.zeros(grid.shape, bool)
    for k in range(n_pairs):
        centre = np.array([-rng.uniform(20, 60), rng.uniform(-80, 50), rng.uniform(-20, 50)]).round()
        gap = [axes[a] - centre[a] for a in range(3)]
        ball = gap[0][:, None, None] ** 2 + gap[1][:, None] ** 2 + gap[2] ** 2 <= rng.uniform(7, 12) ** 2
        ball &= ~claimed
        claimed |= ball
        for side, mask in (("left", ball), ("right", ball[::-1])):
            region_ids.append(f"ball_{k}@{side}")
            parcels.append(np.flatnonzero(mask).astype(np.int32))
            weights.append(np.ones(len(parcels[-1]), np.float32))
    for k in range(n_pairs):
        start = np.array([-rng.uniform(15, 60), rng.uniform(-80, 50), rng.uniform(-20, 50)])
        end = np.array([-rng.uniform(15, 60), rng.uniform(-80, 50), rng.uniform(-20, 50)])
        bend = np.array([-1.0, rng.uniform(-10, 10), rng.uniform(0, 15)])
        lines, core = _tube(rng, start, end, bend, n_streamlines, radius_mm)
        for side, flip in (("left", 1), ("right", -1)):
            segment_ids.append(f"tube.part_{k}@{side}")
            bundles.append([line * np.array([flip, 1, 1], np.float32) for line in lines])
            cores.append(core)
    lines = [line for bundle in bundles for line in bundle]
    n_elements = len(region_ids) + len(segment_ids)
    return Geometry(
        grid=grid,
        region_ids=tuple(region_ids),
        segment_ids=tuple(segment_ids),
        region_voxels=np.concatenate(parcels),
        region_weights=np.concatenate(weights),
        region_offsets=np.cumsum([0, *(len(p) for p in parcels)]),
        points_mm=np.concatenate(lines),
        streamline_offsets=np.cumsum([0, *(len(line) for line in lines)]),
        segment_offsets=np.cumsum([0, *(len(b) for b in bundles)]),
        core=np.concatenate([np.asarray(c, bool) for c in cores]),
        streamline_weights=np.ones(len(lines), np.float32),
        spread_mm=np.repeat(np.linspace(1.5, 4, n_elements // 2), 2).astype(np.float32),
        anatomy=("template",) * n_elements,
        content_hash=hashlib.sha256(f"toy {n_pairs} {n_streamlines} {seed} {radius_mm}".encode()).hexdigest(),
    )


def label_layers(geometry: Geometry) -> list[tuple[np.ndarray, list[int]]]:
    """Hard parcels as label volumes (region r has label r + 1), as few as keep overlapping parcels apart."""
    layers: list[tuple[np.ndarray, list[int]]] = []
    for region in range(len(geometry.region_ids)):
        voxels = geometry.parcel_voxels(region)
        for layer, held in layers:
            if not layer[voxels].any():
                layer[voxels] = region + 1
                held.append(region)
                break
        else:
            layer = np.zeros(geometry.grid.size, np.int32)
            layer[voxels] = region + 1
            layers.append((layer, [region]))
    return [(layer.reshape(geometry.grid.shape), held) for layer, held in layers]
