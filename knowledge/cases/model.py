"""What case.yaml holds: typed, frozen values; the JSON Schema beside this file is made from them.

Coordinates are MNI mm in the template's space; volumes named by ``file`` lie beside case.yaml in the case folder.
"""

from __future__ import annotations

import datetime
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, model_validator

__all__ = [
    "SCHEMA_VERSION",
    "AnatomySpec",
    "Asymmetry",
    "CaseFile",
    "CompartmentSpec",
    "FindingSpec",
    "LesionSpec",
    "PersonSpec",
    "ScanSpec",
    "ShapeSpec",
    "VisitSpec",
    "case_schema",
]

SCHEMA_VERSION = 1

Point = tuple[float, float, float]
Share = Annotated[float, Field(ge=0.0, le=1.0)]
# YAML reads an unquoted 2026-11-03 as a date; people write it so.
Day = Annotated[
    str, BeforeValidator(lambda v: v.isoformat() if isinstance(v, datetime.date) else v), Field(max_length=40)
]
Millimetre = Annotated[float, Field(ge=0.0, le=100.0)]


class _Block(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class PersonSpec(_Block):
    """The person, as little as the reasoning needs; never a name."""

    handedness: Literal["right", "left", "ambidextrous", "unknown"] = "unknown"
    age_band: Annotated[str, Field(pattern=r"^\d{1,3}-\d{1,3}$|^\d{2,3}\+$|^unknown$")] = "unknown"
    pseudonym: Annotated[str, Field(max_length=60)] | None = None


class ShapeSpec(_Block):
    """A sphere or an axis-aligned ellipsoid; ``radii_mm`` are the half-axes along x, y, z."""

    shape: Literal["sphere", "ellipsoid"]
    centre_mm: Point
    radii_mm: tuple[Annotated[float, Field(gt=0, le=100)], ...]

    @model_validator(mode="after")
    def _radii(self) -> ShapeSpec:
        wanted = (1, 3) if self.shape == "sphere" else (3,)
        if len(self.radii_mm) not in wanted:
            raise ValueError(f"a {self.shape} takes {' or '.join(map(str, wanted))} radii, not {len(self.radii_mm)}")
        if self.shape == "sphere" and len(set(self.radii_mm)) != 1:
            raise ValueError("a sphere's radii are equal; use shape: ellipsoid")
        return self


class CompartmentSpec(_Block):
    """A labelled part of the lesion, from a volume or from shapes, with its effect between 0 and 1."""

    name: Annotated[str, Field(min_length=1, max_length=60)]
    kind: Literal["core", "oedema", "other"]
    effect: Share
    file: str | None = None
    label: int | None = None
    shapes: tuple[ShapeSpec, ...] = ()

    @model_validator(mode="after")
    def _one_origin(self) -> CompartmentSpec:
        if (self.file is None) == (not self.shapes):
            raise ValueError("a compartment takes either `file` or `shapes`")
        return self


class LesionSpec(_Block):
    """The lesion: compartments, a graded effect map, or both."""

    drawn_on: Literal["dwi", "flair", "t1", "t2", "t1_contrast", "ct", "swi", "perfusion", "unknown"] = "unknown"
    boundary_mm: Millimetre | None = None
    compartments: tuple[CompartmentSpec, ...] = ()
    effect_map: str | None = None


class FindingSpec(_Block):
    """One observation. ``sign`` is a sign key or an HPO id; ``side`` is the side of the body or of the field."""

    sign: str
    side: Literal["left", "right", "none"] = "none"
    grade: Literal["absent", "mild", "moderate", "severe"]
    test: str | None = None
    date: Day | None = None
    by: str | None = None


class Asymmetry(_Block):
    """A measured asymmetry of a segment: (right - left) / (right + left), between -1 and 1."""

    segment: str
    index: Annotated[float, Field(ge=-1.0, le=1.0)]
    measure: str = "volume"
    note: str | None = None


class ScanSpec(_Block):
    """A scan shown behind the lesion, already in template space."""

    name: str
    file: str
    sequence: str = "unknown"


class AnatomySpec(_Block):
    """Own anatomy in the place of the template's: a folder of files, and a table of which stands for which element.

    ``folder`` lies in the case folder; all other files lie in ``folder``. ``mapping`` is mapping.csv or mapping.tsv
    where it is left out. A bundle in native space needs an ``affine`` (text, 4 x 4) or a ``displacement`` (NIfTI, mm).
    """

    name: Annotated[str, Field(min_length=1, max_length=60)]
    kind: Literal["tract_maps", "labels", "bundles"]
    folder: str = "anatomy"
    mapping: str | None = None
    affine: str | None = None
    displacement: str | None = None
    axes: Literal["ras", "lps"] | None = None
    spread_mm: Annotated[float, Field(ge=0.0, le=20.0)] | None = None

    @model_validator(mode="after")
    def _transform(self) -> AnatomySpec:
        if self.name.strip().lower() in ("", "template"):
            raise ValueError(f"{self.name!r} does not say whose anatomy it is")
        if self.affine and self.displacement:
            raise ValueError("take either `affine` or `displacement`")
        if (self.affine or self.displacement) and self.kind != "bundles":
            raise ValueError("only bundles are led to template space; resample volumes there first")
        if (self.displacement is None) != (self.axes is None):
            raise ValueError("`displacement` goes with `axes`: ras or lps")
        return self


class VisitSpec(_Block):
    """A later time point: what was found then, and the lesion then where it was drawn anew."""

    date: Day
    stage: Literal["acute", "subacute", "chronic"]
    lesion: LesionSpec | None = None
    findings: tuple[FindingSpec, ...] = ()


class CaseFile(_Block):
    """case.yaml, whole."""

    schema_version: Literal[1] = 1
    title: Annotated[str, Field(max_length=200)] | None = None
    invented: bool = False
    person: PersonSpec = PersonSpec()
    stage: Literal["acute", "subacute", "chronic"]
    cause: Literal[
        "infarct",
        "haemorrhage",
        "tumour",
        "low_grade_tumour",
        "high_grade_tumour",
        "metastasis",
        "meningioma",
        "abscess",
        "infection",
        "inflammation",
        "trauma",
        "surgery",
        "vascular_malformation",
        "epilepsy",
        "degeneration",
        "other",
        "unknown",
    ] = "unknown"
    lesion: LesionSpec = LesionSpec()
    scans: tuple[ScanSpec, ...] = ()
    findings: tuple[FindingSpec, ...] = ()
    visits: tuple[VisitSpec, ...] = ()
    asymmetries: tuple[Asymmetry, ...] = ()
    anatomy: tuple[AnatomySpec, ...] = ()
    overlays: tuple[str, ...] = ()
    priors: dict[str, float | dict[str, float]] = {}


def case_schema() -> dict[str, Any]:
    """The JSON Schema of case.yaml, made from :class:`CaseFile`."""
    schema = CaseFile.model_json_schema()
    schema["$schema"] = "https://json-schema.org/draft/2020-12/schema"
    schema["title"] = "byway case"
    return schema
