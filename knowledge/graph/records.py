"""The records of the graph: frozen values that know nothing of files, geometry or damage.

One record a block of the curated text. Keys are unique within their kind. A place in the brain is an *element*:
a region or a segment with a side, written ``key@side`` (``ifg_opercularis@left``,
``arcuate_fasciculus.long_ventral@left``, ``corpus_callosum.rostrum@midline``).
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

__all__ = [
    "Claim",
    "Dependence",
    "Domain",
    "Function",
    "Grade",
    "Hpo",
    "Icf",
    "Laterality",
    "Norm",
    "Pathway",
    "PathwayKind",
    "Point",
    "Record",
    "Region",
    "Route",
    "Segment",
    "Side",
    "SideRule",
    "Sign",
    "Source",
    "Studied",
    "Variability",
]

Side = Literal["left", "right", "midline"]
Point = tuple[float, float, float]
Share = Annotated[float, Field(ge=0.0, le=1.0)]
Positive = Annotated[float, Field(gt=0.0)]

Laterality = Literal["dominant", "nondominant", "each_side", "bilateral", "left", "right"]
SideRule = Literal["contralateral", "ipsilateral", "dominant", "nondominant", "either", "bilateral"]
PathwayKind = Literal["association", "commissural", "projection", "limbic", "cerebellar", "brainstem"]
Studied = Literal["well", "moderately", "hardly"]
Variability = Literal["low", "moderate", "high"]
Grade = Literal["mild", "moderate", "severe"]
Domain = Literal[
    "language",
    "speech",
    "reading_writing",
    "calculation",
    "visual_field",
    "higher_vision",
    "audition",
    "spatial_attention",
    "praxis",
    "motor",
    "somatosensory",
    "memory",
    "executive",
    "behaviour_emotion_social",
]


class Record(BaseModel):
    """Base of all records: frozen, and no unknown fields."""

    model_config = ConfigDict(frozen=True, extra="forbid", allow_inf_nan=False)

    key: str


class Source(Record):
    """A publication. ``checked`` says whether its text was read or is recalled from memory.

    ``title`` is None where it is not recalled with certainty: better no title than a wrong one.
    """

    authors: str
    year: Annotated[int, Field(ge=1800, le=2100)]
    title: str | None = None
    container: str
    doi: str | None = None
    checked: Literal["read", "memory"]
    note: str | None = None


class Region(Record):
    """A grey-matter parcel or nucleus; seeds are given for the left side (x < 0) or the midline, in MNI mm."""

    name: str
    sides: Literal["paired", "midline"]
    tissue: Literal["cortex", "deep_grey", "brainstem", "cerebellum", "white_matter"]
    seeds_mni: tuple[Point, ...]
    volume_ml: Positive
    serves_in_words: str
    sources: tuple[str, ...]
    xref: str | None = None
    note: str | None = None


class Segment(Record):
    """The part of a pathway between two places; ``key`` is ``pathway.segment``.

    ``from_place`` and ``to_place`` are region references, or ``wm:name`` for a junction inside white matter where
    another segment takes over. ``waypoints_mni`` run from the first to the second, left side or midline, MNI mm.
    """

    pathway: str
    name: str
    sides: Literal["paired", "midline"]
    from_place: str
    to_place: str
    course: str
    waypoints_mni: tuple[Point, ...]
    radius_mm: Positive
    variability: Variability
    studied: Studied
    crossing: str
    fit: str
    serves_in_words: str
    sources: tuple[str, ...]
    note: str | None = None


class Pathway(Record):
    """A named white-matter pathway and the keys of its segments."""

    name: str
    kind: PathwayKind
    segments: tuple[str, ...]
    disputed: str | None = None


class Route(BaseModel):
    """One ordered chain of element references that can serve a function.

    ``usual_load`` is the share of the function that this route usually carries; a function's loads sum to 1.
    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    key: str
    name: str
    usual_load: Share
    chain: tuple[str, ...]
    note: str | None = None


class Function(Record):
    """A cognitive or bodily function that needs regions joined by segments.

    Laterality: ``dominant`` and ``nondominant`` follow language dominance; ``each_side`` has an independent copy in
    each hemisphere; ``bilateral`` is one function served by both hemispheres; ``left`` and ``right`` are fixed.
    """

    name: str
    domain: Domain
    laterality: Laterality
    routes: tuple[Route, ...]
    description: str
    note: str | None = None


class Hpo(BaseModel):
    """A Human Phenotype Ontology term and how well it matches."""

    model_config = ConfigDict(frozen=True, extra="forbid")
    id: Annotated[str, Field(pattern=r"^HP:\d{7}$")]
    label: str
    match: Literal["exact", "broader"]


class Icf(BaseModel):
    """A code of the International Classification of Functioning."""

    model_config = ConfigDict(frozen=True, extra="forbid")
    code: str
    title: str
    checked: Literal["read", "memory"]


class Dependence(BaseModel):
    """How a sign follows the loss of one function: a term of the noisy-OR.

    ``weight`` is the probability that the sign is there when the function is gone. ``weight_dominant`` replaces it
    for the copy of an ``each_side`` function that lies in the language-dominant hemisphere. ``thresholds`` are the
    capacities at which the sign is as likely as not to be mild, moderate, severe or worse.
    """

    model_config = ConfigDict(frozen=True, extra="forbid")
    function: str
    weight: Share = 0.9
    weight_dominant: Share | None = None
    thresholds: tuple[Share, Share, Share] = (0.7, 0.45, 0.2)


class Sign(Record):
    """Something observed at the bedside or on testing."""

    name: str
    domain: Domain
    side_rule: SideRule
    hpo: Hpo | None = None
    icf: Icf | None = None
    examination: str
    minutes: Positive
    sensitivity: Share
    specificity: Share
    accuracy_source: str
    leak: Annotated[float, Field(gt=0.0, le=0.3)] = 0.02
    depends: tuple[Dependence, ...]
    note: str | None = None


class Claim(Record):
    """One statement of the graph with its evidence.

    ``subject`` and ``object`` are keys (bare, without side). ``relation``: a region or segment ``serves`` a function;
    loss of a function ``shows_as`` a sign; a segment ``joins`` a region; an element ``compensates`` a function; a
    function is ``lateralised``; ``exists`` speaks of a bundle itself.
    """

    says: str
    subject: str
    relation: Literal["serves", "shows_as", "joins", "compensates", "lateralised", "exists"]
    object: str
    grade: Literal["strong", "moderate", "weak"]
    kind: Literal[
        "lesion_study",
        "direct_electrical_stimulation",
        "tractography_correlation",
        "functional_imaging",
        "dissection",
        "meta_analysis",
        "handbook",
    ]
    population: Literal["patients", "healthy", "both"]
    stance: Literal["supports", "disputes"]
    sources: Annotated[tuple[str, ...], Field(min_length=1)]
    note: str | None = None


class Norm(Record):
    """A number about people in general (a prior, a spread, an error), with unit and sources."""

    name: str
    value: float | dict[str, float]
    unit: str
    basis: Literal["read", "memory", "judgement"]
    sources: tuple[str, ...] = ()
    note: str | None = None
