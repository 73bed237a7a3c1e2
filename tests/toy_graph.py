"""A small invented graph and invented damage draws: reasoning is tested without curated text or geometry."""

from __future__ import annotations

import numpy as np

from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.records import (
    Claim,
    Dependence,
    Function,
    Norm,
    Pathway,
    Region,
    Route,
    Segment,
    Sign,
    Source,
)

__all__ = ["FUNCTIONS", "NORMS", "toy_draws", "toy_graph"]

NORMS: dict[str, float | dict[str, float]] = {
    "language_dominance_right": {"right": 0.04, "ambidextrous": 0.15, "left": 0.27, "unknown": 0.065},
    "headroom": {"acute": 0.0, "subacute": 0.15, "chronic": 0.35, "slow_growing": 0.6},
    "remote_input_loss_threshold": 0.5,
    "remote_effect_size": 0.6,
    "finding_lapse": 0.05,
    "scenario_prior_speaks": {"cortical": 0.25, "segments": 0.15, "both": 0.6},
    "scenario_prior_perilesional": {"infarct": 0.15, "tumour": 0.35, "other": 0.2},
    "scenario_prior_remote": {"acute": 0.25, "subacute": 0.15, "chronic": 0.06, "slow_growing": 0.04},
    "perilesional_kept_by_stage": {"acute": 1.0, "subacute": 0.7, "chronic": 0.3},
    "scenario_prior_boundary": {"as_drawn": 0.88, "too_small": 0.07, "too_large": 0.05},
    "scenario_prior_reliance": {"usual": 0.8, "second": 0.2},
    "scenario_prior_outside": 0.08,
    "outside_sign_rate": {"mild": 0.25, "moderate": 0.15, "severe": 0.06},
    "reliance_second_load": 0.8,
    "arcuate_long_lateralisation": {"strongly_left": 0.625, "mildly_left": 0.2, "symmetrical": 0.175},
}

REGIONS = ("temporal", "frontal", "parietal", "hand", "face", "thalamus", "hippocampus", "visual")
SEGMENTS = {
    "arc.long": ("temporal", "frontal"),
    "arc.anterior": ("parietal", "frontal"),
    "arc.posterior": ("temporal", "parietal"),
    "motor.corona": ("hand", "wm:capsule"),
    "motor.corona_face": ("face", "wm:capsule"),
    "motor.capsule": ("wm:capsule", "thalamus"),
    "radiation.front": ("thalamus", "frontal"),
    "radiation.back": ("thalamus", "visual"),
    "limbic.arch": ("hippocampus", "thalamus"),
}


def _route(key: str, load: float, *chain: str) -> Route:
    return Route(key=key, name=key, usual_load=load, chain=chain)


def _function(key: str, laterality: str, *routes: Route, domain: str = "language") -> Function:
    return Function(key=key, name=key.title(), domain=domain, laterality=laterality, routes=routes, description="toy")


FUNCTIONS = (
    _function("repetition", "dominant",
              _route("direct", 0.6, "temporal", "arc.long", "frontal"),
              _route("indirect", 0.4, "temporal", "arc.posterior", "parietal", "arc.anterior", "frontal")),
    _function("comprehension", "dominant", _route("only", 1.0, "temporal")),
    _function("speech", "dominant", _route("only", 1.0, "frontal")),
    _function("attention", "nondominant", _route("only", 1.0, "parietal", "arc.anterior", "frontal")),
    _function("hand_use", "each_side", _route("only", 1.0, "hand", "motor.corona", "motor.capsule"), domain="motor"),
    _function("face_use", "each_side", _route("only", 1.0, "face", "motor.corona_face", "motor.capsule"),
              domain="motor"),
    _function("field", "each_side", _route("only", 1.0, "thalamus", "radiation.back", "visual"),
              domain="visual_field"),
    _function("memory", "bilateral", _route("only", 1.0, "hippocampus", "limbic.arch", "thalamus"), domain="memory"),
)  # fmt: skip


def _sign(key: str, rule: str, *depends: Dependence, minutes: float = 2.0, domain: str = "language") -> Sign:
    name = key.replace("_", " ").title()
    return Sign(key=key, name=name, domain=domain, side_rule=rule, examination="toy", minutes=minutes,
                sensitivity=0.9, specificity=0.95, accuracy_source="memory", depends=depends)  # fmt: skip


def _on(function: str, weight: float = 0.9, **more: object) -> Dependence:
    return Dependence(function=function, weight=weight, **more)


SIGNS = (
    _sign("repetition_loss", "dominant", _on("repetition")),
    _sign("comprehension_loss", "dominant", _on("comprehension")),
    _sign("halting_speech", "dominant", _on("speech"), _on("repetition", 0.3)),
    _sign("neglect", "contralateral", _on("attention", 0.7), domain="spatial_attention"),
    _sign("hand_weakness", "contralateral", _on("hand_use", 0.95), domain="motor"),
    _sign("face_weakness", "contralateral", _on("face_use", 0.9), domain="motor"),
    _sign("slurred_speech", "either", _on("face_use", 0.5, weight_dominant=0.7), domain="motor", minutes=1.0),
    _sign("trouble_swallowing", "bilateral", _on("face_use", 0.9), domain="motor"),
    _sign("hemianopia", "contralateral", _on("field", 0.95), domain="visual_field", minutes=3.0),
    _sign("amnesia", "bilateral", _on("memory", 0.9), domain="memory", minutes=10.0),
)


def toy_graph(
    *, functions: tuple[Function, ...] = FUNCTIONS, signs: tuple[Sign, ...] = SIGNS, **norms: float | dict[str, float]
) -> Graph:
    """A graph of eight regions and nine segments a side; functions, signs and norms can be replaced."""
    regions = {key: Region(key=key, name=key.title(), sides="paired", tissue="cortex", seeds_mni=((-40.0, 0.0, 0.0),),
                           volume_ml=5.0, serves_in_words="toy", sources=()) for key in REGIONS}  # fmt: skip
    segments = {
        key: Segment(key=key, pathway=key.partition(".")[0], name=key.partition(".")[2], sides="paired",
                     from_place=start, to_place=end, course="toy", waypoints_mni=((-40.0, 0.0, 0.0), (-40.0, 9.0, 0.0)),
                     radius_mm=4.0, variability="high", studied="well", crossing="none", fit="toy",
                     serves_in_words="toy", sources=())
        for key, (start, end) in SEGMENTS.items()
    }  # fmt: skip
    owners = dict.fromkeys(segment.pathway for segment in segments.values())
    pathways = {}
    for key in owners:
        own = tuple(segment for segment in segments if segment.startswith(f"{key}."))
        pathways[key] = Pathway(key=key, name=key.title(), kind="association", segments=own)
    sources = {"toy_1900": Source(key="toy_1900", authors="Nobody A", year=1900, title="Invented", container="None",
                                  checked="memory")}  # fmt: skip
    claims: dict[str, Claim] = {}
    for function in functions:
        for element in dict.fromkeys(e.partition("@")[0] for route in function.routes for e in route.chain):
            key = f"{element.replace('.', '_')}_serves_{function.key}"
            claims[key] = _claim(key, element, "serves", function.key, "supports")
    for sign in signs:
        for each in sign.depends:
            key = f"{each.function}_shows_as_{sign.key}"
            claims[key] = _claim(key, each.function, "shows_as", sign.key, "supports")
    claims["long_disputed"] = _claim("long_disputed", "arc.long", "serves", "repetition", "disputes")
    values = {**NORMS, **norms}
    return Graph(
        regions=regions, pathways=pathways, segments=segments, functions={f.key: f for f in functions},
        signs={s.key: s for s in signs}, claims=claims, sources=sources,
        norms={key: Norm(key=key, name=key, value=value, unit="1", basis="judgement") for key, value in values.items()},
    )  # fmt: skip


def _claim(key: str, subject: str, relation: str, obj: str, stance: str) -> Claim:
    says = f"{subject} {relation} {obj}"
    return Claim(key=key, says=says, subject=subject, relation=relation, object=obj, grade="moderate",
                 kind="lesion_study", population="patients", stance=stance, sources=("toy_1900",))  # fmt: skip


def toy_draws(
    graph: Graph, damage: dict[str, float], *, draws: int = 40, spread: float = 0.15, seed: int = 0
) -> tuple[tuple[str, ...], dict[str, np.ndarray], np.ndarray]:
    """Element ids, draws of all variants and point shares for damage given by element id.

    Damaged elements vary about their share between draws; variants add or take a little.
    """
    ids = graph.all_element_ids
    share = np.array([damage.get(element, 0.0) for element in ids], np.float32)
    rng = np.random.default_rng(seed)
    noise = rng.normal(0.0, spread, (draws, len(ids))).astype(np.float32)
    hit = share > 0
    drawn = {}
    for variant, shift in (("as_drawn", 0.0), ("too_small", 0.15), ("too_large", -0.15), ("perilesional", 0.1)):
        drawn[variant] = np.where(hit, np.clip(share + noise + shift, 0.0, 1.0), 0.0).astype(np.float32)
    return ids, drawn, share
