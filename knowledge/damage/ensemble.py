"""The ensemble: damage over virtual anatomies, registrations and drawn boundaries."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.damage.anatomies import Anatomies, normal_levels
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.nearby import NearSample
from byway.knowledge.damage.point import effect_voxels
from byway.knowledge.damage.sample import Sample
from byway.knowledge.damage.words import VARIANTS, EffectWords
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.lesion import Lesion

__all__ = ["VARIANTS", "Ensemble", "EnsembleSettings", "EnsembleStoppedError", "Norms", "ensemble"]

Progress = Callable[[int, int], object]
_SHIFTS = 7  # boundary shifts that stand for the normal distribution of the boundary's error


class EnsembleStoppedError(Exception):
    """The progress callback asked to stop."""


class Norms(Protocol):
    """What gives numbers about people in general: the graph."""

    def norm(self, key: str, member: str | None = None) -> float:
        """The value of a norm, or of one member of it."""
        ...


@dataclass(frozen=True)
class EnsembleSettings:
    """What varies, and by how much.

    Parameters
    ----------
    draws : int
        Number of virtual anatomies, M.
    seed : int
        Seed; the same settings give the same numbers.
    boundary_sd_mm : float
        Standard deviation of the drawn boundary, mm.
    jitter_mm, jitter_deg : float
        Standard deviation of the registration's shift along and turn about each axis.
    departure_mm : float, optional
        How much larger the true lesion is in ``too_small`` and smaller in ``too_large``, mm; twice
        ``boundary_sd_mm`` where None.
    rim_mm, rim_effect : float
        Width (mm) and effect (0 to 1) of the rim around the lesion in ``perilesional``.
    spread_scale : float
        Multiplies every element's between-subject spread; 0 keeps everyone's anatomy the template's.
    """

    draws: int = 200
    seed: int = 0
    boundary_sd_mm: float = 1.0
    jitter_mm: float = 1.0
    jitter_deg: float = 0.5
    departure_mm: float | None = None
    rim_mm: float = 8.0
    rim_effect: float = 0.5
    spread_scale: float = 1.0

    def __post_init__(self) -> None:
        amounts = {
            "a boundary's doubt of {:g} mm": self.boundary_sd_mm,
            "a registration shift of {:g} mm": self.jitter_mm,
            "a registration turn of {:g} degrees": self.jitter_deg,
            "a boundary's departure of {:g} mm": self.departure_mm or 0.0,
            "a rim of {:g} mm": self.rim_mm,
            "a spread between people times {:g}": self.spread_scale,
        }
        wrong = [f"{self.draws} draws"] if self.draws < 1 else []
        wrong += [words.format(amount) for words, amount in amounts.items() if not 0 <= amount < 60]
        if not 0 <= self.rim_effect <= 1:
            wrong.append(f"a rim effect of {self.rim_effect:g}")
        if wrong:
            right = "at least one draw, amounts from 0 to below 60, a rim effect of 0 to 1"
            raise BywayError(Fault("ensemble-settings", "virtual anatomies", ", ".join(wrong), right))

    @classmethod
    def from_norms(cls, norms: Norms, lesion: Lesion, *, draws: int = 200, seed: int = 0) -> EnsembleSettings:
        """Settings from the graph's norms, for the sequence that the lesion was drawn on.

        The lesion's own ``boundary_mm`` goes before the norm of its sequence.
        """
        boundary = lesion.boundary_mm
        if boundary is None:
            boundary = norms.norm("boundary_mm", lesion.drawn_on or "unknown")
        return cls(
            draws=draws,
            seed=seed,
            boundary_sd_mm=boundary,
            jitter_mm=norms.norm("registration_jitter_mm"),
            jitter_deg=norms.norm("registration_jitter_deg"),
            rim_mm=norms.norm("perilesional_rim_mm"),
            rim_effect=norms.norm("perilesional_effect"),
        )


@dataclass(frozen=True, eq=False)
class Ensemble:
    """Damage in every draw.

    Parameters
    ----------
    element_ids : tuple of str
        Elements, in the order of the arrays.
    draws : dict of variant to (M, E) float32
        Lost and severed shares; draw m is the same person, registration and boundary in every variant.
    settings : EnsembleSettings
        What it was drawn with.
    """

    element_ids: tuple[str, ...] = field(repr=False)
    draws: dict[str, NDArray[np.float32]] = field(repr=False)
    settings: EnsembleSettings = EnsembleSettings()

    def interval(
        self, variant: str = "as_drawn", *, level: float = 0.9
    ) -> tuple[NDArray[np.float32], NDArray[np.float32]]:
        """Lower and upper bound (E,) of the share: the middle ``level`` of the draws (5 to 95 % by default)."""
        tail = (1 - level) / 2
        low, high = np.quantile(self.draws[variant], [tail, 1 - tail], axis=0)
        return low.astype(np.float32), high.astype(np.float32)

    def mean(self, variant: str = "as_drawn") -> NDArray[np.float32]:
        """Mean share (E,) over the draws."""
        return np.asarray(self.draws[variant].mean(axis=0, dtype=np.float64).astype(np.float32))

    def hit_probability(self, share: float = 0.05, variant: str = "as_drawn") -> NDArray[np.float32]:
        """Share (E,) of draws in which an element's damage exceeds ``share``."""
        return np.asarray((self.draws[variant] > share).mean(axis=0).astype(np.float32))


def ensemble(
    lesion: Lesion | NDArray[np.floating],
    index: DamageIndex,
    settings: EnsembleSettings = EnsembleSettings(),
    *,
    sample: Sample | None = None,
    progress: Progress | None = None,
) -> Ensemble:
    """Damage over virtual anatomies.

    Parameters
    ----------
    lesion : Lesion or effect map
        As for :func:`byway.knowledge.damage.point.point_damage`.
    index : DamageIndex
        Geometry.
    settings : EnsembleSettings
        What varies.
    sample : Sample, optional
        Points to reckon on; the index's own (100 streamlines, every second point, 300 voxels) where None.
    progress : callable, optional
        Called now and then with draws done (the work so far, in draws) and draws in all; when it returns ``False``
        the work stops.

    Returns
    -------
    Ensemble
        Variants: ``as_drawn``; ``too_small`` (the true lesion is larger than drawn), ``too_large``; ``perilesional``
        (a rim around the lesion is out of action too).

    Raises
    ------
    EnsembleStoppedError
        The callback returned False.

    Notes
    -----
    Displacements are rounded to whole voxels and are constant within cells of 8 mm, so that a draw is a gather of
    offsets, a gather of words and one OR along every streamline. They are cut at 2.5 standard deviations. A boundary
    is never moved in so far that the lesion vanishes. More than 15 distinct effects are rounded to fifteenths.
    """
    sample = index.sample if sample is None else sample
    n_elements = len(index.geometry.element_ids)
    voxels, effects = effect_voxels(lesion)
    draws = {name: np.zeros((settings.draws, n_elements), np.float32) for name in VARIANTS}
    if len(voxels) == 0:
        return Ensemble(index.geometry.element_ids, draws, settings)
    side_mm = float(np.cbrt(index.geometry.grid.voxel_ml * 1000))
    departure = 2 * settings.boundary_sd_mm if settings.departure_mm is None else settings.departure_mm
    n_shifts = _SHIFTS if settings.boundary_sd_mm > 0 else 1
    words = EffectWords.build(
        np.stack(np.unravel_index(voxels, sample.shape), axis=1),
        effects,
        (normal_levels(n_shifts) * settings.boundary_sd_mm / side_mm).tolist(),
        departure=departure / side_mm,
        rim=settings.rim_mm / side_mm,
        rim_effect=settings.rim_effect,
    )
    anatomies = Anatomies(settings.draws, settings.seed, settings.jitter_mm / side_mm, settings.jitter_deg)
    near = NearSample.build(sample, words, anatomies, settings.spread_scale / side_mm)
    offset = near.offsets(anatomies, sample)
    volumes = [np.pad(volume, near.pad).reshape(-1) for volume in words.volumes]
    draws_of_shift = [np.flatnonzero(_shift_of_draw(settings, n_shifts) == shift) for shift in range(n_shifts)]
    for part in near.parts():
        met = part.words(volumes, draws_of_shift, offset)
        for name in VARIANTS:
            draws[name][:, part.elements] = part.shares(words.decoded(met, name))
        done = settings.draws * part.last // max(1, len(near.base))
        if progress is not None and progress(done, settings.draws) is False:
            raise EnsembleStoppedError
    return Ensemble(index.geometry.element_ids, draws, settings)


def _shift_of_draw(settings: EnsembleSettings, n_shifts: int) -> NDArray[np.int64]:
    """Which boundary shift each draw has: every shift equally often, a draw and its mirror image alike."""
    half = (settings.draws + 1) // 2
    order = np.random.default_rng([settings.seed, 1]).permutation(half)
    first = np.empty(half, np.int64)
    first[order] = np.arange(half) % n_shifts
    return np.concatenate([first, first])[: settings.draws]
