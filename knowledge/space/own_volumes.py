"""A site's volumes in the place of the template's elements: probability maps of tracts and regions, label volumes."""

from __future__ import annotations

import zlib
from dataclasses import dataclass

import nibabel as nib
import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import label as components
from scipy.ndimage import map_coordinates
from scipy.sparse import csr_matrix, diags
from scipy.sparse.csgraph import dijkstra
from scipy.sparse.linalg import cg

from byway.knowledge.faults import Fault, ImageError
from byway.knowledge.space.bundles import STREAMLINES
from byway.knowledge.space.curves import resample, smooth
from byway.knowledge.space.front import VoxelGraph, voxel_graph
from byway.knowledge.space.grid import TEMPLATE_GRID, Grid
from byway.knowledge.space.mapping import MappingRow
from byway.knowledge.space.own_bundles import OwnSegment, core_of
from byway.knowledge.space.template import brain_mask

__all__ = ["OwnRegion", "own_membership", "region_from", "segment_from"]

_INSIDE_SHARE = 0.5
_END_SHARE = 0.12
_SMOOTHING_POINTS = 5.0
_WHOLE = 1.0 + 1e-3
_PERCENT = 100.0 + 1e-3


@dataclass(frozen=True)
class OwnRegion:
    """Voxels of the template grid (C order, sorted) and their membership in (0, 1], in the place of a parcel."""

    voxels: NDArray[np.int32]
    weights: NDArray[np.float32]


def own_membership(row: MappingRow) -> NDArray[np.float32]:
    """Membership in [0, 1] of every template voxel in the element of one row, from a volume in template space.

    The volume may have any grid: label volumes are read at the nearest voxel, maps by linear interpolation. Maps in
    percent (largest value above 1, at most 100) are divided by 100.

    Raises
    ------
    ImageError
        The file cannot be read; it is not one 3-D volume; the label is not in it; values are negative, above 100
        or nowhere positive; or less than half of it lies in the template's brain.
    """
    data, grid = _volume(row)
    if row.label is not None:
        present = np.unique(data)
        if row.label not in present:
            raise ImageError(
                Fault(
                    "own-label",
                    row.where,
                    f"no voxel of {row.path.name} has the value {row.label}",
                    f"one of its {len(present)} values, {present.min():g} to {present.max():g}",
                )
            )
        data = (data == row.label).astype(np.float32)
    else:
        data = _probabilities(row, data)
    membership = _on_template(data, grid, order=0 if row.label is not None else 1)
    inside = float(membership[brain_mask()].sum()) / max(float(membership.sum()), 1e-9)
    if not membership.any() or inside < _INSIDE_SHARE:
        raise ImageError(
            Fault(
                "own-elsewhere",
                row.where,
                f"{inside:.0%} of {row.path.name} lies in the template's brain",
                "at least 50 %",
                "bring the volume to template space first",
            )
        )
    return membership


def _volume(row: MappingRow) -> tuple[NDArray[np.float32], Grid]:
    try:
        image = nib.Nifti1Image.from_filename(str(row.path))
        data = np.asarray(image.dataobj, np.float32)
    except (OSError, ValueError, EOFError, zlib.error, nib.filebasedimages.ImageFileError) as error:
        raise ImageError(Fault("own-file", row.where, f"{row.path.name}: {error}", "a NIfTI volume")) from error
    data = data[..., 0] if data.ndim == 4 and data.shape[3] == 1 else data
    affine = np.asarray(image.affine, float)
    if data.ndim != 3 or not np.isfinite(affine).all() or abs(np.linalg.det(affine[:3, :3])) < 1e-9:
        raise ImageError(Fault("own-shape", row.where, f"{row.path.name}: shape {data.shape}", "one 3-D volume in mm"))
    return data, Grid((int(data.shape[0]), int(data.shape[1]), int(data.shape[2])), affine)


def _probabilities(row: MappingRow, data: NDArray[np.float32]) -> NDArray[np.float32]:
    finite = np.nan_to_num(data, nan=0.0, posinf=np.inf, neginf=-np.inf)
    largest, smallest = float(finite.max()), float(finite.min())
    if smallest < 0 or not 0 < largest <= _PERCENT:
        raise ImageError(
            Fault(
                "own-values", row.where, f"{row.path.name}: values {smallest:g} to {largest:g}",
                "probabilities, 0 to 1, or percent", "divide by the largest count first",
            )
        )  # fmt: skip
    return finite if largest <= _WHOLE else finite / np.float32(100.0)


def _on_template(data: NDArray[np.float32], grid: Grid, order: int) -> NDArray[np.float32]:
    if grid.shape == TEMPLATE_GRID.shape and np.allclose(grid.affine, TEMPLATE_GRID.affine):
        return np.clip(data, 0.0, 1.0)
    filled = np.argwhere(data > 0)
    corners = np.array(np.meshgrid(*zip(filled.min(0) - 1, filled.max(0) + 1, strict=True))).reshape(3, -1).T
    box = TEMPLATE_GRID.to_voxel(grid.to_mm(corners))
    low = np.maximum(np.floor(box.min(0)).astype(int), 0)
    high = np.minimum(np.ceil(box.max(0)).astype(int) + 1, TEMPLATE_GRID.shape)
    volume = np.zeros(TEMPLATE_GRID.shape, np.float32)
    if (high <= low).any():
        return volume
    voxels = np.indices(high - low).reshape(3, -1).T + low
    values = map_coordinates(data, grid.to_voxel(TEMPLATE_GRID.to_mm(voxels)).T, order=order, mode="constant")
    volume[tuple(voxels.T)] = np.clip(values, 0.0, 1.0)
    return volume


def region_from(membership: NDArray[np.float32]) -> OwnRegion:
    """Parcel of all voxels with a membership above 1 %, weighed by it."""
    flat = np.flatnonzero(membership > 0.01)
    return OwnRegion(flat.astype(np.int32), membership.reshape(-1)[flat].astype(np.float32))


def segment_from(row: MappingRow, membership: NDArray[np.float32], course_mm: NDArray[np.floating]) -> OwnSegment:
    """Streamlines through a map, from the end where the template's course starts to the end where it stops.

    Parameters
    ----------
    row : MappingRow
        Element and threshold.
    membership : (197, 233, 189) float32
        Probability of the tract on the template grid.
    course_mm : (n, 3) float
        Core line of the template's segment.

    Returns
    -------
    OwnSegment
        208 streamlines, weighed by the mean probability along each.

    Raises
    ------
    ImageError
        If the map above the threshold is empty or falls into pieces none of which reaches from end to end.

    Notes
    -----
    A map says where a tract may be and not how fibres run in it. The streamlines follow a potential flow through the
    largest connected part of the map: potential 1 at one end, 0 at the other, and conductance equal to probability,
    so that together they fill the map as a current would, and keep side by side.
    """
    pieces, count = components(membership >= row.threshold, np.ones((3, 3, 3)))
    if count == 0:
        raise ImageError(
            Fault("own-threshold", row.where, f"no voxel of {row.path.name} reaches {row.threshold:g}",
                  f"at least one; its largest value is {membership.max():g}")
        )  # fmt: skip
    domain = pieces == 1 + int(np.argmax(np.bincount(pieces.reshape(-1))[1:]))
    low = np.maximum(np.argwhere(domain).min(0) - 1, 0)
    high = np.argwhere(domain).max(0) + 2
    box = tuple(slice(int(a), int(b)) for a, b in zip(low, high, strict=True))
    inside, probability = domain[box], membership[box]
    graph = voxel_graph(inside, np.ones(inside.shape))
    places = TEMPLATE_GRID.to_mm(np.argwhere(inside) + low)
    first, last = _end_zones(graph, places, np.asarray(course_mm, float))
    rng = np.random.default_rng(zlib.crc32(row.element.encode()))
    chains = _currents(graph, probability[inside], first, last, rng)
    streamlines = [_smoothed(places[chain]) for chain in chains if len(chain) > 1]
    if not streamlines:
        raise ImageError(
            Fault("own-map", row.where, f"{row.path.name} is too small for streamlines", "a map of some length")
        )
    core, middle = core_of(streamlines)
    along = [membership.reshape(-1)[TEMPLATE_GRID.flat_index(line)].mean() for line in streamlines]
    weights = np.maximum(np.array(along, np.float32), 1e-3)
    note = f"{row.path.name}: {len(streamlines)} streamlines drawn through the map above {row.threshold:g}"
    return OwnSegment(streamlines, core, weights, streamlines[middle], (note,))


def _end_zones(
    graph: VoxelGraph, places: NDArray[np.float64], course: NDArray[np.float64]
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Nodes at the two ends of the map: farthest from each other along it, on the sides of the course's two ends."""
    matrix = graph.matrix()
    near = [int(np.argmin(np.linalg.norm(places - point, axis=1))) for point in (course[0], course[-1])]
    from_last = dijkstra(matrix, indices=near[1])
    from_first = dijkstra(matrix, indices=near[0])
    run = from_last - from_first
    share = max(1, int(_END_SHARE * len(places)))
    order = np.argsort(np.nan_to_num(run, posinf=0.0, neginf=0.0), kind="stable")
    return order[-share:], order[:share]


def _currents(
    graph: VoxelGraph,
    probability: NDArray[np.floating],
    first: NDArray[np.int64],
    last: NDArray[np.int64],
    rng: np.random.Generator,
) -> list[NDArray[np.int64]]:
    """Chains of nodes from the first zone to the last, drawn in proportion to the current between them."""
    length = graph.cost.astype(float)
    conductance = 0.5 * (probability[graph.first] + probability[graph.second]) / length
    ends = np.concatenate([graph.first, graph.second]), np.concatenate([graph.second, graph.first])
    potential = _potential(graph.count, ends, np.tile(conductance, 2), first, last)
    flow = np.tile(conductance, 2) * (potential[ends[0]] - potential[ends[1]])
    down = flow > 1e-12
    order = np.argsort(ends[0][down], kind="stable")
    source, target, flow = ends[0][down][order], ends[1][down][order], flow[down][order]
    total = np.bincount(source, flow, minlength=graph.count)
    # Row i holds the shares of its current as one stretch of the unit from i to i + 1.
    run = np.cumsum(flow / total[source])
    before = np.concatenate([[0.0], np.cumsum(total > 0)])[source]
    mark = source + np.clip(run - before, 0.0, 1.0)
    sinks = np.zeros(graph.count, bool)
    sinks[last] = True
    start = rng.choice(first, STREAMLINES, p=total[first] / total[first].sum())
    steps = [start]
    for _ in range(graph.count):
        at = steps[-1]
        going = ~sinks[at] & (total[at] > 0)
        if not going.any():
            break
        chosen = np.minimum(np.searchsorted(mark, at + rng.random(len(at))), len(target) - 1)
        steps.append(np.where(going, target[chosen], at))
    walks = np.array(steps).T
    return [walk[np.concatenate([[True], walk[1:] != walk[:-1]])] for walk in walks]


def _potential(
    count: int,
    ends: tuple[NDArray[np.int32], NDArray[np.int32]],
    conductance: NDArray[np.floating],
    first: NDArray[np.int64],
    last: NDArray[np.int64],
) -> NDArray[np.float64]:
    """Potential at every node: 1 on the first zone, 0 on the last, no current gained or lost elsewhere."""
    potential = np.full(count, 0.5)
    potential[first], potential[last] = 1.0, 0.0
    free = np.ones(count, bool)
    free[first] = free[last] = False
    links = csr_matrix((conductance, ends), shape=(count, count))
    whole = np.asarray(links.sum(axis=1)).ravel()
    inner = links[free]
    system = diags(whole[free]) - inner[:, free]
    given = inner[:, ~free] @ potential[~free]
    scale = diags(1.0 / whole[free])
    solved, _ = cg(system, given, x0=potential[free], rtol=1e-6, maxiter=2000, M=scale)
    potential[free] = solved
    return potential


def _smoothed(corners: NDArray[np.float64]) -> NDArray[np.float32]:
    line = resample(corners, 0.5)
    line = smooth(line, min(_SMOOTHING_POINTS, len(line) / 8)) if len(line) > 8 else line
    return resample(line).astype(np.float32)
