"""Scenarios: what the scan does not tell, as seven axes, every combination with a prior from the graph's norms."""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.networks import FunctionNetwork
from byway.knowledge.graph.references import Hemisphere

__all__ = [
    "AXES",
    "USUAL",
    "AxisPriors",
    "Priors",
    "Scenario",
    "axis_priors",
    "enumerate_scenarios",
    "headroom_of",
    "leaning",
    "prior_vector",
    "setting_of",
]

AXES: dict[str, tuple[str, ...]] = {
    "dominance": ("left", "right"),
    "reliance": ("usual", "second"),
    "outside": ("no", "yes"),
    "speaks": ("both", "cortical", "segments"),
    "perilesional": ("no", "yes"),
    "remote": ("no", "yes"),
    "boundary": ("as_drawn", "too_small", "too_large"),
}
"""The axes in the order in which scenarios are numbered, each with its values; the first value is no departure."""

USUAL = {axis: values[0] for axis, values in AXES.items()}

AxisPriors = dict[str, dict[str, float]]
Priors = Mapping[str, float | Mapping[str, float]]

SLOW_CAUSES = frozenset({"low_grade_tumour", "meningioma"})
"""Causes that grow over months to years in a brain that is otherwise well, so that function had time to move."""


PASSING_CAUSES = frozenset({"infarct", "haemorrhage", "trauma", "surgery", "resection"})
"""Causes whose swelling and threatened rim come at once and then pass."""


@dataclass(frozen=True)
class Scenario:
    """One answer to everything that the scan does not tell.

    Parameters
    ----------
    dominance : {'left', 'right'}
        Hemisphere that leads language.
    reliance : {'usual', 'second'}
        Whether the person leans on the usual or on the second route of functions that have one; primary functions of
        one side (strength, feeling, half field) have parts, not ways to choose among, and never shift.
    outside : {'no', 'yes'}
        Whether part of the findings has a cause outside the lesion.
    speaks : {'both', 'cortical', 'segments'}
        Which of the damage shows: all of it, that of grey regions only, or that of segments only (what is cut
        outside the regions at their ends).
    perilesional : {'no', 'yes'}
        Whether a rim around the lesion is out of action.
    remote : {'no', 'yes'}
        Whether regions that lost their input are silenced.
    boundary : {'as_drawn', 'too_small', 'too_large'}
        Whether the drawing is right, smaller or larger than the true lesion.
    """

    dominance: Hemisphere = "left"
    reliance: Literal["usual", "second"] = "usual"
    outside: Literal["no", "yes"] = "no"
    speaks: Literal["both", "cortical", "segments"] = "both"
    perilesional: Literal["no", "yes"] = "no"
    remote: Literal["no", "yes"] = "no"
    boundary: Literal["as_drawn", "too_small", "too_large"] = "as_drawn"

    @property
    def departures(self) -> tuple[tuple[str, str], ...]:
        """Axes and values that differ from as drawn, typical organisation.

        >>> Scenario(dominance="right", remote="yes").departures
        (('dominance', 'right'), ('remote', 'yes'))
        """
        return tuple((axis, getattr(self, axis)) for axis in AXES if getattr(self, axis) != USUAL[axis])


def enumerate_scenarios() -> tuple[Scenario, ...]:
    """All 288 combinations; the last axis runs fastest.

    >>> len(enumerate_scenarios())
    288
    """
    return tuple(Scenario(**dict(zip(AXES, values, strict=True)))  # type: ignore[arg-type]
                 for values in itertools.product(*AXES.values()))  # fmt: skip


def axis_priors(graph: Graph, handedness: str, stage: str, cause: str, overrides: Priors | None = None) -> AxisPriors:
    """Prior of every value of every axis.

    Parameters
    ----------
    graph : Graph
        Its norms ``language_dominance_right`` and ``scenario_prior_*`` are read.
    handedness, stage, cause : str
        Members of those norms. A cause that has no member takes ``other``.
    overrides : mapping, optional
        A case's own priors: axis name to a mapping of values (they are scaled to sum to 1) or, for an axis of two
        values, to the probability of the departure. ``scenario_prior_`` before an axis name is allowed.

    Raises
    ------
    BywayError
        An override of an unknown axis or value, a negative number, or one that leaves a value no probability.
    GraphError
        A norm is missing.
    """
    slow = cause in SLOW_CAUSES
    remote_stage = "slow_growing" if slow and stage != "acute" else stage
    by_cause = graph.norms.get("scenario_prior_perilesional")
    members = by_cause.value if by_cause is not None and isinstance(by_cause.value, dict) else {}
    right = graph.norm("language_dominance_right", handedness)
    perilesional = graph.norm("scenario_prior_perilesional", cause if cause in members else "other")
    if cause in PASSING_CAUSES:
        perilesional *= graph.norm("perilesional_kept_by_stage", stage)
    remote = graph.norm("scenario_prior_remote", remote_stage)
    outside = graph.norm("scenario_prior_outside")
    priors: AxisPriors = {
        "dominance": {"left": 1.0 - right, "right": right},
        "reliance": {value: graph.norm("scenario_prior_reliance", value) for value in AXES["reliance"]},
        "outside": {"no": 1.0 - outside, "yes": outside},
        "speaks": {value: graph.norm("scenario_prior_speaks", value) for value in AXES["speaks"]},
        "perilesional": {"no": 1.0 - perilesional, "yes": perilesional},
        "remote": {"no": 1.0 - remote, "yes": remote},
        "boundary": {value: graph.norm("scenario_prior_boundary", value) for value in AXES["boundary"]},
    }
    for name, given in (overrides or {}).items():
        axis = name.removeprefix("scenario_prior_")
        priors[axis] = _override(axis, given, priors)
    return {axis: {value: p / sum(values.values()) for value, p in values.items()} for axis, values in priors.items()}


def prior_vector(priors: AxisPriors) -> NDArray[np.float64]:
    """Prior of every scenario, in the order of :func:`enumerate_scenarios`; sums to 1."""
    vector: NDArray[np.float64] = np.ones(1)
    for axis, values in AXES.items():
        vector = np.multiply.outer(vector, np.array([priors[axis][value] for value in values])).ravel()
    scaled: NDArray[np.float64] = vector / vector.sum()
    return scaled


def headroom_of(graph: Graph, stage: str, cause: str) -> float:
    """Share by which an intact element can carry more than its usual load, by stage; more for slowly growing causes."""
    usual = graph.norm("headroom", stage)
    return max(usual, graph.norm("headroom", "slow_growing")) if cause in SLOW_CAUSES and stage != "acute" else usual


def setting_of(scenario: Scenario) -> int:
    """Number of a scenario's setting (dominance, reliance).

    >>> setting_of(Scenario()), setting_of(Scenario(dominance="right", reliance="second"))
    (0, 3)
    """
    return AXES["dominance"].index(scenario.dominance) * len(AXES["reliance"]) + AXES["reliance"].index(
        scenario.reliance
    )


def leaning(network: FunctionNetwork, second_load: float) -> FunctionNetwork | None:
    """The network of a person who leans on the second route; None where the function has only one.

    Parameters
    ----------
    second_load : float
        Share of the function that the second route then carries; the others keep their proportions. A bilateral
        function's route written out on both sides counts as one.
    """
    groups: dict[str, float] = {}
    names = [key.partition("@")[0] for key in network.route_keys]
    for name, load in zip(names, network.route_loads, strict=True):
        groups[name] = groups.get(name, 0.0) + load
    ranked = sorted(groups, key=lambda name: -groups[name])
    if len(ranked) < 2 or groups[ranked[1]] <= 0.0:
        return None
    second = ranked[1]
    share = max(second_load, groups[second])
    rest = 1.0 - groups[second]
    return network.with_loads([
        load * (share / groups[second] if name == second else (1.0 - share) / rest)
        for name, load in zip(names, network.route_loads, strict=True)
    ])


def _override(axis: str, given: float | Mapping[str, float], priors: AxisPriors) -> dict[str, float]:
    """One axis of a case's own priors."""
    where = f"priors: {axis}"
    if axis not in AXES:
        raise BywayError(Fault("unknown-axis", where, "no such axis", ", ".join(AXES)))
    values = AXES[axis]
    if isinstance(given, Mapping):
        unknown = [value for value in given if value not in values]
        if unknown:
            raise BywayError(Fault("unknown-value", where, ", ".join(unknown), ", ".join(values)))
        chosen = {value: float(given.get(value, priors[axis][value])) for value in values}
    elif len(values) == 2:
        chosen = {values[0]: 1.0 - float(given), values[1]: float(given)}
    else:
        expected = f"a number for each of {', '.join(values)}"
        raise BywayError(Fault("prior-type", where, f"one number, {given}", expected))
    if any(not 0.0 < p < np.inf for p in chosen.values()):
        raise BywayError(Fault("prior-range", where, str(chosen), "numbers above 0 and below 1: nothing is ruled out"))
    return chosen
