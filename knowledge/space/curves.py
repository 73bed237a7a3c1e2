"""Polylines in space: arc length, resampling, smoothing, and frames that do not twist."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline
from scipy.ndimage import gaussian_filter1d

__all__ = ["arc_length", "frames", "resample", "smooth", "spline_through"]

Curve = NDArray[np.float64]


def arc_length(curve: NDArray[np.floating]) -> NDArray[np.float64]:
    """Distance in mm along an (n, 3) polyline from its first point to each point.

    >>> arc_length(np.array([[0, 0, 0], [3, 4, 0], [3, 4, 2]])).tolist()
    [0.0, 5.0, 7.0]
    """
    steps = np.linalg.norm(np.diff(np.asarray(curve, float), axis=0), axis=1)
    return np.concatenate([[0.0], np.cumsum(steps)])


def resample(curve: NDArray[np.floating], spacing_mm: float = 1.0) -> Curve:
    """Points at equal distances, at most ``spacing_mm`` apart, from the first to the last point of a polyline."""
    curve = np.asarray(curve, float)
    along = arc_length(curve)
    count = max(2, int(np.ceil(along[-1] / spacing_mm - 1e-9)) + 1)
    wanted = np.linspace(0.0, along[-1], count)
    return np.column_stack([np.interp(wanted, along, curve[:, axis]) for axis in range(3)])


def spline_through(points: NDArray[np.floating], spacing_mm: float = 0.5) -> Curve:
    """Smooth curve through (n, 3) points (cubic in centripetal arc length), resampled at ``spacing_mm``."""
    points = np.asarray(points, float)
    steps = np.sqrt(np.maximum(np.linalg.norm(np.diff(points, axis=0), axis=1), 1e-6))
    knots = np.concatenate([[0.0], np.cumsum(steps)])
    if len(points) == 2:
        return resample(points, spacing_mm)
    fine = np.linspace(0.0, knots[-1], 40 * len(points))
    return resample(CubicSpline(knots, points, bc_type="natural")(fine), spacing_mm)


def smooth(curve: NDArray[np.floating], sigma_points: float) -> Curve:
    """Gaussian smoothing along a polyline of equal spacing; both ends stay where they are."""
    curve = np.asarray(curve, float)
    line = np.linspace(curve[0], curve[-1], len(curve))
    # An odd continuation about each end keeps the ends fixed and the tangents there free.
    deviation = curve - line
    pad = min(len(curve) - 1, int(4 * sigma_points) + 1)
    extended = np.concatenate([-deviation[pad:0:-1], deviation, -deviation[-2 : -pad - 2 : -1]])
    filtered = gaussian_filter1d(extended, sigma_points, axis=0, mode="nearest")
    return np.asarray(line + filtered[pad : pad + len(curve)])


def frames(curve: NDArray[np.floating]) -> tuple[Curve, Curve, Curve]:
    """Unit tangent and two unit normals at each point, carried along with the least twist (double reflection).

    Method: Wang, Juttler, Zheng, Liu 2008, ACM Transactions on Graphics 27(1):2 (from memory).
    """
    curve = np.asarray(curve, float)
    tangent = np.gradient(curve, axis=0)
    tangent /= np.maximum(np.linalg.norm(tangent, axis=1, keepdims=True), 1e-12)
    start = np.eye(3)[np.argmin(np.abs(tangent[0]))]
    normal = np.empty_like(curve)
    normal[0] = start - (start @ tangent[0]) * tangent[0]
    normal[0] /= np.linalg.norm(normal[0])
    for i in range(len(curve) - 1):
        step = curve[i + 1] - curve[i]
        squared = max(float(step @ step), 1e-12)
        reflected = normal[i] - (2 / squared) * (step @ normal[i]) * step
        turned = tangent[i] - (2 / squared) * (step @ tangent[i]) * step
        second = tangent[i + 1] - turned
        weight = float(second @ second)
        if weight > 1e-12:
            reflected = reflected - (2 / weight) * (second @ reflected) * second
        normal[i + 1] = reflected / np.linalg.norm(reflected)
    return tangent, normal, np.cross(tangent, normal)
