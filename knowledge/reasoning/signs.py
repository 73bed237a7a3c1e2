"""Signs from capacities: a noisy-OR over the functions that a sign depends on, and the likelihood of a finding.

``P(sign at grade g or worse) = 1 - (1 - leak_g) * prod_i (1 - weight_i * s((threshold_ig - capacity_i) / width))``
(noisy-OR: Pearl 1988), where ``s`` is a logistic, stretched so that an intact function (capacity 1) adds nothing and
one that is gone (capacity 0) adds its full weight.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.references import Hemisphere, other_side, split_reference
from byway.knowledge.reasoning.findings import GRADES, Finding, reading_matrix

__all__ = ["WIDTH", "LossCache", "SignModel", "Term", "combined_capacity", "loss", "outside_tails", "sign_models"]

Array = NDArray[np.float32]

WIDTH = 0.08
"""Width of the logistic, in units of capacity."""

LEAK_BY_GRADE = (1.0, 0.5, 0.2)
"""Share of a sign's leak (its presence for no reason in the graph) that reaches mild, moderate, severe or worse."""


@dataclass(frozen=True)
class Term:
    """One dependence of a sign, resolved to function copies.

    Parameters
    ----------
    copies : tuple of str
        One copy id; or two, of which the better preserved counts.
    weight : float
        Probability of the sign when the function is gone.
    thresholds : tuple of float
        Capacities at which the sign is about as likely as not to be mild, moderate, severe or worse, times weight.
    """

    copies: tuple[str, ...]
    weight: float
    thresholds: tuple[float, float, float]


@dataclass(frozen=True)
class SignModel:
    """A sign on one side, for one language dominance.

    ``sensitivity`` and ``specificity`` are those of the usual bedside test, in [0, 1].
    """

    sign_id: str
    terms: tuple[Term, ...]
    leak: float
    sensitivity: float
    specificity: float

    @property
    def copies(self) -> tuple[str, ...]:
        """All function copies that it depends on."""
        return tuple(dict.fromkeys(copy for term in self.terms for copy in term.copies))

    def tail(self, grade: int, losses: LossCache) -> Array | float:
        """P(sign at grade ``grade`` or worse); 0 is mild. A plain float where no function of it is damaged."""
        intact = 1.0 - self.leak * LEAK_BY_GRADE[grade]
        absent: Array | None = None
        for term in self.terms:
            lost = losses.get(term.copies, term.thresholds[grade])
            if lost is not None:
                spared: Array = np.float32(1.0) - np.float32(term.weight) * lost
                absent = spared if absent is None else absent * spared
        if absent is None:
            return 1.0 - intact
        there: Array = np.float32(1.0) - np.float32(intact) * absent
        return there

    def found(self, presence: NDArray[np.float64]) -> NDArray[np.float64]:
        """P(test finds the sign) from P(sign there at all)."""
        return (1.0 - self.specificity) + presence * (self.sensitivity + self.specificity - 1.0)

    def likelihood(self, finding: Finding, tails: tuple[Array | float, ...], lapse: float) -> Array:
        """P(finding | P(grade or worse)), in (0, 1).

        Parameters
        ----------
        tails : tuple of three arrays or floats
            P(mild or worse), P(moderate or worse), P(severe).
        lapse : float
            Probability that the finding says nothing; then absent and present are equally likely.
        """
        column = reading_matrix(self.sensitivity, self.specificity)[:, GRADES.index(finding.grade)]
        told = np.asarray(column[0], np.float32)
        for grade, tail in enumerate(tails):
            told = told + tail * np.float32(column[grade + 1] - column[grade])
        blank = 1.0 / 6.0 if finding.present else 0.5
        probability: Array = np.float32(1.0 - lapse) * told + np.float32(lapse * blank)
        return probability


def loss(capacity: NDArray[np.floating], threshold: float) -> Array:
    """How far a function counts as lost at one threshold, in [0, 1]: 0 at capacity 1 and 1 at capacity 0.

    >>> [round(float(each), 2) for each in loss(np.array([0.0, 0.7, 1.0]), 0.7)]
    [1.0, 0.49, 0.0]
    """
    raw = 1.0 / (1.0 + np.exp((np.asarray(capacity, np.float32) - np.float32(threshold)) / np.float32(WIDTH)))
    whole = 1.0 / (1.0 + np.exp((1.0 - threshold) / WIDTH))
    gone = 1.0 / (1.0 + np.exp(-threshold / WIDTH))
    stretched: Array = np.clip((raw - np.float32(whole)) / np.float32(gone - whole), 0.0, 1.0).astype(np.float32)
    return stretched


def combined_capacity(capacities: Mapping[str, Array], copies: tuple[str, ...]) -> Array | None:
    """Capacity that a term sees: of one copy, or the larger of two; None where that is 1 throughout.

    ``capacities`` holds damaged copies only; a copy that is not in it is intact.
    """
    found = [capacities[copy] for copy in copies if copy in capacities]
    if len(found) < len(copies):
        return None
    return found[0] if len(found) == 1 else np.maximum(found[0], found[1])


class LossCache:
    """Losses by copies and threshold, so that signs which share them reckon them once.

    Parameters
    ----------
    capacities : mapping
        Damaged copies and their capacity; others are intact.
    known : dict, optional
        Losses already reckoned, shared with caches in which some copies have the very same capacities.
    """

    def __init__(
        self, capacities: Mapping[str, Array], known: dict[tuple[tuple[int, ...], float], Array] | None = None
    ) -> None:
        self._capacities = capacities
        self._known = {} if known is None else known

    def get(self, copies: tuple[str, ...], threshold: float) -> Array | None:
        """Loss of the copies at a threshold; None where they are intact in every state."""
        if any(copy not in self._capacities for copy in copies):
            return None
        key = tuple(id(self._capacities[copy]) for copy in copies), threshold
        if key not in self._known:
            capacity = combined_capacity(self._capacities, copies)
            assert capacity is not None
            self._known[key] = loss(capacity, threshold)
        return self._known[key]


def outside_tails(tails: tuple[Array | float, ...], rates: tuple[float, ...]) -> tuple[Array | float, ...]:
    """P(grade or worse) when a cause outside the lesion adds the sign with its own rate per grade."""
    return tuple(1.0 - (1.0 - tail) * (1.0 - rate) for tail, rate in zip(tails, rates, strict=True))


def sign_models(graph: Graph, dominance: Hemisphere) -> dict[str, SignModel]:
    """Every sign on every side, for a person whose language dominance lies on the given side.

    A sign seen on one side of the body, which depends on a function that lies in one hemisphere (dominant or
    nondominant), follows it only on the side which that hemisphere serves.
    """
    models = {}
    for sign_id in graph.sign_ids():
        key, side = split_reference(sign_id)
        sign = graph.signs[key]
        terms: list[Term] = []
        for dependence, copies in graph.sign_dependences(sign_id, dominance):
            hemispheres = [_hemisphere(copy, dominance) for copy in copies]
            if sign.side_rule in ("contralateral", "ipsilateral") and len(copies) == 1 and hemispheres[0]:
                serves = other_side(hemispheres[0]) if sign.side_rule == "contralateral" else hemispheres[0]
                if serves != side:
                    continue
            groups = [copies] if sign.side_rule == "bilateral" or len(copies) == 1 else [(copy,) for copy in copies]
            for group in groups:
                led = dependence.weight_dominant is not None and _hemisphere(group[0], dominance) == dominance
                weight = dependence.weight_dominant if led and len(group) == 1 else dependence.weight
                mild, moderate, severe = dependence.thresholds
                falling = (mild, min(mild, moderate), min(mild, moderate, severe))
                terms.append(Term(group, float(weight or 0.0), falling))
        models[sign_id] = SignModel(sign_id, tuple(terms), sign.leak, sign.sensitivity, sign.specificity)
    return models


def _hemisphere(copy_id: str, dominance: Hemisphere) -> Hemisphere | None:
    """Hemisphere that a function copy lies in; None where it lies in both."""
    side = split_reference(copy_id)[1]
    if side == "dominant":
        return dominance
    if side == "nondominant":
        return other_side(dominance)
    return "left" if side == "left" else "right" if side == "right" else None
