"""Strokes and polygons: the kernel's voxels, a plain twin, and the browser's voxels."""

from __future__ import annotations

import json
import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from byway.widgets.state.raster import in_plane_axes, polygon_voxels, stroke_voxels

SHAPE = (40, 50, 30)
RASTER_JS = Path(__file__).resolve().parents[2] / "widgets" / "slices" / "raster.js"


def points(most: int) -> st.SearchStrategy[list[float]]:
    """Plane coordinates in sixteenths of a voxel, also beyond the grid."""
    return st.lists(st.integers(-80, 900), min_size=2, max_size=2 * most).map(
        lambda v: [x / 16 for x in v[: len(v) // 2 * 2]]
    )


@given(st.integers(0, 2), st.integers(-2, 55), points(6), st.integers(1, 96), st.booleans())
@settings(max_examples=60, deadline=None)
def test_a_stroke_is_what_lies_near_its_line(
    plane: int, index: int, line: list[float], radius16: int, ball: bool
) -> None:
    """Every voxel whose centre is nearer than the radius is painted, and none farther, up to float32 rounding."""
    radius = radius16 / 8
    got = np.zeros(SHAPE, bool)
    got.reshape(-1)[stroke_voxels(SHAPE, plane, index, line, radius, ball=ball)] = True
    first, second = in_plane_axes(plane)
    ijk = np.indices(SHAPE).astype(float)
    a, b, gap = ijk[first], ijk[second], ijk[plane] - index
    nearest = np.full(SHAPE, np.inf)
    p = np.array(line).reshape(-1, 2)
    for start, end in zip(p[:-1] if len(p) > 1 else p, p[1:] if len(p) > 1 else p, strict=True):
        d = end - start
        t = np.clip(((a - start[0]) * d[0] + (b - start[1]) * d[1]) / max(float(d @ d), 1e-30), 0, 1)
        nearest = np.minimum(nearest, (a - start[0] - t * d[0]) ** 2 + (b - start[1] - t * d[1]) ** 2)
    distance = np.sqrt(nearest + gap**2) if ball else np.where(gap == 0, np.sqrt(nearest), np.inf)
    assert got[distance < radius - 1e-3].all()
    assert not got[distance > radius + 1e-3].any()


def test_a_disc_counts_as_a_drawn_circle() -> None:
    """A dab of radius 2 on whole coordinates holds the 13 points of the plane with x2 + y2 <= 4."""
    assert len(stroke_voxels(SHAPE, 2, 10, [20, 20], 2.0, ball=False)) == 13


def test_a_ball_counts_as_a_sphere() -> None:
    """A ball of radius 2 holds the 33 points of space with x2 + y2 + z2 <= 4."""
    assert len(stroke_voxels(SHAPE, 1, 20, [20, 15], 2.0, ball=True)) == 33


def test_a_square_polygon_holds_its_inside() -> None:
    """A square from 4.5 to 14.5 holds ten by ten voxels, in either direction of drawing."""
    square = [4.5, 4.5, 14.5, 4.5, 14.5, 14.5, 4.5, 14.5]
    turned = [v for pair in reversed(list(zip(square[::2], square[1::2], strict=True))) for v in pair]
    assert len(polygon_voxels(SHAPE, 0, 3, square)) == 100
    assert np.array_equal(polygon_voxels(SHAPE, 0, 3, square), polygon_voxels(SHAPE, 0, 3, turned))


def test_the_browser_paints_the_same_voxels() -> None:
    """raster.js and raster.py agree voxel for voxel on 400 random strokes and polygons, on every plane."""
    node = shutil.which("node")
    if node is None:
        pytest.skip("node is not installed: the browser's rasteriser is compared in the browser tests only")
    rng = np.random.default_rng(7)
    jobs = []
    for n in range(400):
        kind = "polygon" if n % 4 == 0 else "stroke"
        count = int(rng.integers(3, 9)) if kind == "polygon" else int(rng.integers(1, 12))
        line = (np.cumsum(rng.normal(0, 40, (count, 2)), 0) + rng.integers(0, 640, 2)).round() / 16
        jobs.append({"kind": kind, "plane": n % 3, "index": int(rng.integers(0, 30)), "points": line.ravel().tolist(),
                     "radius": float(rng.choice([0.5, 1, 1.5, 2.5, 4, 7.3, 11])), "ball": bool(n % 2)})  # fmt: skip
    script = (
        f"import {{ strokeVoxels, polygonVoxels }} from {json.dumps(RASTER_JS.as_uri())};"
        "let text = ''; process.stdin.on('data', (d) => text += d); process.stdin.on('end', () => {"
        f"const shape = {list(SHAPE)};"
        "console.log(JSON.stringify(JSON.parse(text).map((j) => Array.from(j.kind === 'polygon'"
        " ? polygonVoxels(shape, j.plane, j.index, j.points)"
        " : strokeVoxels(shape, j.plane, j.index, j.points, j.radius, j.ball)))));});"
    )
    out = subprocess.run([node, "--input-type=module", "-e", script], input=json.dumps(jobs), capture_output=True,
                         text=True, check=True)  # fmt: skip
    found = json.loads(out.stdout)
    for job, voxels in zip(jobs, found, strict=True):
        if job["kind"] == "polygon":
            mine = polygon_voxels(SHAPE, job["plane"], job["index"], job["points"])
        else:
            mine = stroke_voxels(SHAPE, job["plane"], job["index"], job["points"], job["radius"], ball=job["ball"])
        assert mine.tolist() == voxels, job
