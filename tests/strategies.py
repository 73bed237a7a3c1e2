"""Hypothesis strategies shared by the tests."""

from __future__ import annotations

from typing import Any

import numpy as np
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from byway.knowledge.graph.content import Kind
from byway.knowledge.graph.grammar import to_block
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.overlays import ACTIONS, Action
from byway.knowledge.lesion.lesion import Compartment, Lesion
from byway.knowledge.lesion.shapes import ellipsoid_mask
from byway.knowledge.reasoning.findings import GRADES, Finding

__all__ = [
    "damage_maps", "edit_wishes", "ellipsoids", "finding_lists", "lesions", "plain_mappings", "small_masks", "texts",
]  # fmt: skip

# Words that some readers of YAML take for switches, numbers, times, or marks.
AWKWARD = ("no", "on", "null", "~", "", "12:30", "2026-12-01", "1e3", "0x1f", "1_000", ".5", "- a", "a: b", "#x", "<<")
texts = st.one_of(st.text(st.characters(codec="utf-8"), max_size=20), st.sampled_from(AWKWARD))
_leaves = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(-(10**9), 10**9),
    st.floats(allow_nan=False, allow_infinity=False),
    texts,
)
plain_values = st.recursive(
    _leaves, lambda inner: st.lists(inner, max_size=4) | st.dictionaries(texts, inner, max_size=4), max_leaves=10
)
plain_mappings = st.dictionaries(texts, plain_values, max_size=5)

Wish = tuple[Action, Kind, str, dict[str, Any], str]


@st.composite
def edit_wishes(draw: st.DrawFn, graph: Graph) -> Wish:
    """What a careless editor might ask for: action, kind, key, body, reason. Often against the rules."""
    action = draw(st.sampled_from(ACTIONS))
    kind: Kind = draw(st.sampled_from(("region", "segment", "function", "sign", "claim", "source", "norm", "pathway")))
    known = list(graph.records(kind))
    key = draw(st.sampled_from([*known, f"new_{kind}", "bow.new_part"]))
    reason = draw(st.sampled_from(["", "not borne out", "no: 'really' {x}"]))
    if action in ("retire", "dispute"):
        body = {"sources": draw(st.lists(st.sampled_from([*graph.sources, "nobody_1999"]), max_size=2))}
        return action, kind, key, body if action == "dispute" else {}, reason
    model = to_block(graph.records(kind)[draw(st.sampled_from(known))])
    if action == "change":
        field = draw(st.sampled_from(list(model)))
        model = {field: model[field]}
    body = {name: draw(st.one_of(st.just(value), _spoilt(value))) for name, value in model.items()}
    return action, kind, key, body, reason


def _spoilt(value: Any) -> st.SearchStrategy[Any]:
    """A value of the same shape or of another, in range or out of it."""
    if isinstance(value, bool) or value is None:
        return _leaves
    if isinstance(value, int | float):
        return st.one_of(st.floats(-2, 2), st.integers(-3, 3), texts)
    if isinstance(value, str):
        return st.one_of(texts, st.sampled_from(["worm", "echo", "motor_hand@other", "bow.long", "severe", "midline"]))
    if isinstance(value, list):
        return st.one_of(st.just(value[::-1]), st.just(value[:1]), st.just([]), st.just(value + value))
    return st.one_of(st.just({}), plain_mappings)


@st.composite
def ellipsoids(draw: st.DrawFn, most_mm: float = 25.0) -> np.ndarray:
    """Mask of an ellipsoid whose centre lies in the brain's bounds, on voxel centres or between them."""
    axis = st.one_of(st.integers(-55, 55).map(float), st.floats(-55, 55))
    centre = (draw(axis), draw(axis) - 15, draw(axis) / 2 + 15)
    return ellipsoid_mask(centre, draw(st.tuples(*[st.floats(2, most_mm)] * 3)))


@st.composite
def lesions(draw: st.DrawFn) -> Lesion:
    """One to three compartments of any effect, which may overlap."""
    effects = draw(st.lists(st.floats(0, 1, width=32), min_size=1, max_size=3))
    return Lesion(tuple(Compartment(f"part {i}", "other", e, draw(ellipsoids())) for i, e in enumerate(effects)))


small_masks = hnp.arrays(bool, st.tuples(*[st.integers(1, 9)] * 3))


@st.composite
def damage_maps(draw: st.DrawFn, graph: Graph, most: int = 6) -> dict[str, float]:
    """Damage above 0 of a few elements of a graph, by element id."""
    elements = st.sampled_from(graph.all_element_ids)
    return draw(st.dictionaries(elements, st.floats(0.0625, 1.0, width=32), min_size=1, max_size=most))


@st.composite
def finding_lists(draw: st.DrawFn, graph: Graph, most: int = 6) -> list[Finding]:
    """Findings on different signs of a graph, of any grade, often contradictory."""
    signs = draw(st.lists(st.sampled_from(graph.sign_ids()), unique=True, max_size=most))
    grades = [draw(st.sampled_from(GRADES)) for _ in signs]
    return [Finding(sign.rpartition("@")[0], sign.rpartition("@")[2], grade)  # type: ignore[arg-type]
            for sign, grade in zip(signs, grades, strict=True)]  # fmt: skip
