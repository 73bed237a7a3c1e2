"""The ensemble: damage over virtual anatomies, registrations and drawn boundaries."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.damage.anatomies import Anatomies, normal_levels
from byway.knowledge.damage.index import DamageIndex
from byway.knowledge.damage.point import effect_voxels
from byway.knowledge.damage.sample import CELL, Sample
from byway.knowledge.damage.words import VARIANTS, EffectWords
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.lesion import Lesion

__all__ = ["VARIANTS", "Ensemble", "EnsembleSettings", "EnsembleStoppedError", "Norms", "ensemble"]

Progress = Callable[[int, int], object]
_SHIFTS = 7  # boundary shifts that stand for the normal distribution of the boundary's error
_REPORT_EVERY = 10


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
        amounts = (self.boundary_sd_mm, self.jitter_mm, self.jitter_deg, self.departure_mm or 0.0, self.rim_mm,
                   self.spread_scale)  # fmt: skip
        if self.draws < 1 or not all(0 <= x < 60 for x in amounts) or not 0 <= self.rim_effect <= 1:
            raise BywayError(Fault("ensemble-settings", "ensemble", repr(self),
                                   "at least one draw, amounts of 0 to 60 mm, a rim effect of 0 to 1"))  # fmt: skip

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
        Points to reckon on; the index's own (48 streamlines, every second point, 400 voxels) where None.
    progress : callable, optional
        Called with draws done and draws in all; when it returns ``False`` the work stops.

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
    near = _Near(sample, words, anatomies, settings.spread_scale / side_mm)
    shift_of_draw = _shift_of_draw(settings, n_shifts)
    met = near.words_of_groups(words, anatomies, shift_of_draw, sample, progress)
    for name in VARIANTS:
        draws[name][:, near.elements] = near.shares(words.decoded(met, name))
    return Ensemble(index.geometry.element_ids, draws, settings)


def _shift_of_draw(settings: EnsembleSettings, n_shifts: int) -> NDArray[np.int64]:
    """Which boundary shift each draw has: every shift equally often, a draw and its mirror image alike."""
    half = (settings.draws + 1) // 2
    order = np.random.default_rng([settings.seed, 1]).permutation(half)
    first = np.empty(half, np.int64)
    first[order] = np.arange(half) % n_shifts
    return np.concatenate([first, first])[: settings.draws]


class _Near:
    """The part of a sample that any draw could bring to the lesion, with indices into the padded box."""

    def __init__(self, sample: Sample, words: EffectWords, anatomies: Anatomies, spread_scale: float) -> None:
        spread = sample.spread_mm.astype(float) * spread_scale
        reach = anatomies.reach(spread).astype(np.int32)[sample.mover_element]
        self.pad = int(reach.max(initial=0))
        box = np.array(words.volumes[0].shape)
        # Whole cells first, then points.
        from_box = sample.mover_centre - words.origin
        margin = (reach + CELL // 2 + 1)[:, None]
        near = np.asarray(((from_box >= -margin) & (from_box < box + margin)).all(axis=1))
        kept = np.flatnonzero(near[sample.mover])
        mover, place = sample.mover[kept], sample.voxels[kept] - words.origin
        margin = reach[mover][:, None]
        inside = ((place >= -margin) & (place < box + margin)).all(axis=1)
        kept, mover, place = kept[inside], mover[inside], place[inside]
        group = np.searchsorted(sample.group_offsets, kept, side="right") - 1
        self.group_starts = np.flatnonzero(np.diff(group, prepend=-1))
        groups = group[self.group_starts]
        sizes = np.diff(self.group_starts, append=len(group))
        # The voxels of parcels come first; each is a group of its own, and needs no OR.
        self.alone = int(np.argmax(sizes != 1)) if (sizes != 1).any() else len(sizes)
        self.group_weight = sample.group_weight[groups]
        element = sample.group_element[groups]
        self.element_starts = np.flatnonzero(np.diff(element, prepend=-1))
        self.elements = element[self.element_starts]

        used = np.zeros(len(near), bool)
        used[mover] = True
        self.mover = (np.cumsum(used) - 1)[mover]
        self.mover_centre = sample.mover_centre[used]
        self.mover_element = sample.mover_element[used]
        self.mover_spread = spread[self.mover_element]
        self.shape = tuple(int(n) for n in box + 2 * self.pad)
        padded = place.astype(np.int64) + self.pad
        self.base = (padded[:, 0] * self.shape[1] + padded[:, 1]) * self.shape[2] + padded[:, 2]

    def words_of_groups(
        self,
        words: EffectWords,
        anatomies: Anatomies,
        shift_of_draw: NDArray[np.int64],
        sample: Sample,
        progress: Progress | None,
    ) -> NDArray[np.unsignedinteger]:
        """OR of the words that each group meets, (M, groups)."""
        draws = anatomies.draws
        move = anatomies.displacements(
            self.mover_centre, self.mover_element, self.mover_spread, sample.partner, sample.shape
        )
        along_x, along_y, along_z = move.T.astype(np.int64)
        offset = np.ascontiguousarray(((along_x * self.shape[1] + along_y) * self.shape[2] + along_z).T)
        met = np.zeros((draws, len(self.group_starts)), words.volumes[0].dtype)
        at = np.empty(len(self.base), np.int64)
        found = np.empty(len(self.base), met.dtype)
        done = 0
        for shift, volume in enumerate(words.volumes):
            flat = np.pad(volume, self.pad).reshape(-1)
            for draw in np.flatnonzero(shift_of_draw == shift):
                if len(at):
                    # Every index is in range by construction; "clip" spares take the buffer of "raise".
                    np.take(offset[draw], self.mover, out=at, mode="clip")
                    at += self.base
                    np.take(flat, at, out=found, mode="clip")
                    met[draw, : self.alone] = found[: self.alone]
                    if self.alone < len(self.group_starts):
                        together = self.group_starts[self.alone :] - self.alone
                        np.bitwise_or.reduceat(found[self.alone :], together, out=met[draw, self.alone :])
                done += 1
                report = progress is not None and (done % _REPORT_EVERY == 0 or done == draws)
                if report and progress is not None and progress(done, draws) is False:
                    raise EnsembleStoppedError
        return met

    def shares(self, effects: NDArray[np.float32]) -> NDArray[np.float32]:
        """Weighted sums of the groups' D over each near element, (M, near elements)."""
        if not len(self.elements):
            return np.zeros((len(effects), 0), np.float32)
        shares = np.add.reduceat(effects * self.group_weight, self.element_starts, axis=1)
        return np.minimum(shares, np.float32(1))
