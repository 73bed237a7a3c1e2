"""A case in the hand: what case.yaml says, the folder it lies in, and the lesion built from both."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path

import numpy as np

from byway.knowledge.atomic import fingerprint
from byway.knowledge.cases.files import case_path, inside, read_case, write_case
from byway.knowledge.cases.model import CaseFile, CompartmentSpec, ShapeSpec
from byway.knowledge.faults import CaseError, Fault, nearest
from byway.knowledge.graph.graph import Graph
from byway.knowledge.lesion.images import read_lesion
from byway.knowledge.lesion.lesion import Compartment, Lesion
from byway.knowledge.lesion.shapes import ellipsoid_mask
from byway.knowledge.reasoning.findings import Finding
from byway.knowledge.space.grid import TEMPLATE_GRID

__all__ = ["Case", "open_case"]


@dataclass(frozen=True)
class Case:
    """One case. Frozen; a change makes a new one.

    Parameters
    ----------
    spec : CaseFile
        What case.yaml says.
    folder : Path
        Where the volumes lie.
    seen : str or None
        Fingerprint of case.yaml when it was read; None for a case that was never written.
    where : callable, optional
        Turns a place in case.yaml into ``file:line key`` for faults.
    """

    spec: CaseFile
    folder: Path
    seen: str | None = None
    where: Callable[[tuple[object, ...]], str] | None = field(default=None, compare=False, repr=False)

    @property
    def path(self) -> Path:
        """The case.yaml."""
        return self.folder / "case.yaml"

    def _where(self, *place: object) -> str:
        return self.where(place) if self.where else f"case.yaml {'.'.join(map(str, place))}"

    @cached_property
    def lesion(self) -> Lesion:
        """The lesion on the template grid; notes tell what was done to its files on the way in.

        Raises
        ------
        ImageError
            A volume cannot be used. See :func:`~byway.knowledge.lesion.images.read_lesion`.
        """
        spec, notes = self.spec.lesion, []
        compartments = []
        for compartment in spec.compartments:
            if compartment.file is None:
                compartments.append(_drawn(compartment))
            else:
                read = read_lesion(inside(self.folder, compartment.file), label=compartment.label)
                notes += list(read.notes)
                compartments.append(Compartment(compartment.name, compartment.kind, compartment.effect, read.mask))
        graded = None
        if spec.effect_map is not None:
            read = read_lesion(inside(self.folder, spec.effect_map), graded=True)
            graded, notes = read.effect_volume, [*notes, *read.notes]
        return Lesion(tuple(compartments), graded, spec.drawn_on, spec.boundary_mm, tuple(notes))

    def findings(self, graph: Graph) -> tuple[Finding, ...]:
        """The findings with sign keys resolved.

        Raises
        ------
        CaseError
            A sign is unknown (the nearest is suggested), or its side does not fit the sign.
        """
        by_hpo: dict[str, list[str]] = {}
        for sign in graph.signs.values():
            if sign.hpo is not None:
                by_hpo.setdefault(sign.hpo.id, []).append(sign.key)
        found, seen = [], dict[tuple[str, str, str | None], int]()
        for i, spec in enumerate(self.spec.findings):
            key = self._sign_key(spec.sign, by_hpo, graph, i)
            sign_id = f"{key}@{spec.side}"
            if sign_id not in graph.sign_ids(key):
                sides = [name.rpartition("@")[2] for name in graph.sign_ids(key)]
                advice = ("this sign has no side: leave `side` out" if sides == ["none"]
                          else "give the side of the body or field on which it is seen")  # fmt: skip
                raise CaseError(Fault("side", self._where("findings", i, "side"), f"{key} with side {spec.side}",
                                      f"side {' or '.join(sides)}", advice))  # fmt: skip
            once = (key, spec.side, spec.date)
            if once in seen:
                raise CaseError(Fault("twice", self._where("findings", i), f"{sign_id} stands twice for one date",
                                      "each sign once a date", "give dates, or remove one"))  # fmt: skip
            seen[once] = i
            found.append(Finding(key, spec.side, spec.grade, spec.test, spec.date, spec.by))
        return tuple(found)

    def _sign_key(self, word: str, by_hpo: dict[str, list[str]], graph: Graph, i: int) -> str:
        where = self._where("findings", i, "sign")
        if word in graph.signs:
            return word
        if word in by_hpo:
            keys = by_hpo[word]
            exact = [key for key in keys if (hpo := graph.signs[key].hpo) and hpo.match == "exact"]
            chosen = exact if len(exact) == 1 else keys
            if len(chosen) == 1:
                return chosen[0]
            raise CaseError(Fault("hpo", where, f"{word}, which several signs share", " or ".join(keys), "use the key"))
        raise CaseError(Fault("unknown-sign", where, f"no sign {word!r}", "a sign key or an HPO id",
                              nearest(word, [*graph.signs, *by_hpo])))  # fmt: skip

    def at_visit(self, position: int) -> Case:
        """The case as it stood at a later visit (from 0): its stage and findings, and its lesion if drawn anew."""
        visit = self.spec.visits[position]
        changes: dict[str, object] = {"stage": visit.stage, "findings": visit.findings, "visits": ()}
        if visit.lesion is not None:
            changes["lesion"] = visit.lesion
        return Case(self.spec.model_copy(update=changes), self.folder)

    def with_spec(self, **changes: object) -> Case:
        """A new case with fields of case.yaml changed, checked like a file."""
        data = {**self.spec.model_dump(), **changes}
        return Case(CaseFile.model_validate(data), self.folder, self.seen)

    def save(self) -> Case:
        """Write case.yaml, unless somebody changed it since it was read; see :func:`write_case`."""
        return Case(self.spec, self.folder, write_case(self.path, self.spec, self.seen))


def _drawn(spec: CompartmentSpec) -> Compartment:
    mask = np.zeros(TEMPLATE_GRID.shape, dtype=bool)
    for shape in spec.shapes:
        mask |= ellipsoid_mask(shape.centre_mm, _radii(shape))
    return Compartment(spec.name, spec.kind, spec.effect, mask)


def _radii(shape: ShapeSpec) -> tuple[float, float, float]:
    radii = shape.radii_mm if len(shape.radii_mm) == 3 else shape.radii_mm * 3
    return (radii[0], radii[1], radii[2])


def open_case(path: str | Path) -> Case:
    """Open a case.

    Parameters
    ----------
    path : str or Path
        A case folder, or its case.yaml.

    Raises
    ------
    CaseError
        With file and line: no such case, not YAML, an unknown field, a wrong type.
    """
    file = case_path(path)
    spec, read = read_case(file)
    return Case(spec, file.parent, fingerprint(file), read.where)
