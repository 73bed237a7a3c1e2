"""The observable case: edits and findings in, sequence numbers out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from functools import cached_property
from typing import Any

import numpy as np
import traitlets as t
from numpy.typing import NDArray

from byway.knowledge.cases.files import inside
from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.space.geometry import Geometry
from byway.widgets.state.casefiles import findings_spec, load_scan
from byway.widgets.state.drawing import Change, drawing_of
from byway.widgets.state.drawing_state import DrawingState, Journal
from byway.widgets.state.elements import ElementMap
from byway.widgets.state.resting import Resting
from byway.widgets.state.scans import Scans
from byway.widgets.state.science import NoScience, Science

__all__ = ["BenchState"]


class BenchState(DrawingState):
    """One case under hands, which every panel observes.

    A panel observes a sequence number, then reads the attribute that it announces:

    =================  =====================================================================
    trait              announces
    =================  =====================================================================
    ``lesion_seq``     ``lesion``, ``last_change`` (and who made it), ``drawing``
    ``damage_seq``     ``damage`` (point estimates; at once after every edit)
    ``accounts_seq``   ``ensemble``, ``explanation`` (when the hand rests)
    ``findings_seq``   ``findings``
    ``case_seq``       ``case`` (another case, or its person, stage or cause changed)
    ``scans_seq``      ``scans``
    ``graph_seq``      ``science`` with another graph, and perhaps another geometry (an edit, another model)
    ``pages_seq``      notes, own accounts, standings or versions in the case folder, whoever wrote them
    ``place``          a key of the graph that a panel asks to be shown, or ``""``
    ``author``         who sits here, as the team calls them, or ``""``
    ``selected``       the element id ``key@side`` that panels point out, or ``""``
    ``cursor_mm``      the crosshair, MNI mm
    ``busy``           whether accounts are on their way
    ``notice``         one line for the user: the last fault or remark, or ``""``
    =================  =====================================================================

    Parameters
    ----------
    case : Case, optional
        From ``byway.knowledge.cases``; None draws on an empty template.
    science : Science, optional
        What answers; none answers nothing.
    journal : callable, optional
        Takes a plain dict a change, before the reasoning begins.
    pause_s : float
        How long the hand must rest before intervals and accounts are reckoned.
    """

    damage_seq = t.Int(0)
    accounts_seq = t.Int(0)
    findings_seq = t.Int(0)
    graph_seq = t.Int(0)
    pages_seq = t.Int(0)
    place = t.Unicode("")
    author = t.Unicode("")
    selected = t.Unicode("")
    cursor_mm = t.Tuple(t.Float(), t.Float(), t.Float(), default_value=(0.0, 0.0, 0.0))
    busy = t.Bool(False)

    def __init__(self, case: Any = None, science: Science | None = None, *, journal: Journal | None = None,
                 pause_s: float = 0.35) -> None:  # fmt: skip
        super().__init__(journal)
        self.science: Science = science if science is not None else NoScience()
        self.resting = Resting(pause_s)
        self.damage: Any = None
        self.ensemble: Any = None
        self.explanation: Any = None
        self.following: Any = None
        self.findings: tuple[Any, ...] = ()
        if case is not None:
            self.open(case)

    # -- the case ---------------------------------------------------------------------------------------------------

    def open(self, case: Any) -> None:
        """Show another case; the drawing starts from its lesion, with an empty history."""
        self.case = case
        self.drawing = drawing_of(case.lesion)
        self._open_scans()
        graph = self.science.graph
        self.findings = tuple(case.findings(graph)) if graph is not None else ()
        self._lesion = None
        self.ensemble = self.explanation = None
        self.case_seq += 1
        self.findings_seq += 1
        self._changed(None, {})

    def _open_scans(self) -> None:
        """Load the case's scans as backgrounds; one that cannot be used is told of, and left out."""
        self.scans = Scans()
        for spec in self.case.spec.scans:
            try:
                self.scans.add(replace(load_scan(inside(self.case.folder, spec.file), spec.sequence), name=spec.name))
            except BywayError as error:
                self.tell(error)
        self.scans_seq += 1

    def set_case(self, case: Any) -> None:
        """Put in a case whose person, stage, cause or priors changed; drawing and findings stay."""
        self.case = case
        self.case_seq += 1
        self._note({"kind": "case", "spec": case.spec.model_dump(mode="json")})
        self._rest()

    def adopt(self, case: Any) -> None:
        """Take in what somebody else wrote to the case; the drawing starts anew only where the lesion changed.

        Where its overlays or its own anatomy changed, what is asked from now on is the graph and geometry of those.
        """
        before = self.case.spec
        if (case.spec.overlays, case.spec.anatomy) != (before.overlays, before.anatomy):
            self.use_science(self.science.for_case(case))
        if case.spec.lesion != before.lesion:
            self.open(case)
            return
        self.case = case
        graph = self.science.graph
        self.findings = tuple(case.findings(graph)) if graph is not None else ()
        self.case_seq += 1
        self.findings_seq += 1
        self._rest()

    def save_case(self) -> None:
        """Write the findings and what is known of the person to case.yaml.

        Raises
        ------
        BywayError
            If there is no case.
        CaseError
            If somebody changed case.yaml in between; both versions are kept.
        """
        if self.case is None:
            raise BywayError(Fault("no-case", "save", "no case", "", "open a case first"))
        self.case = self.case.with_spec(findings=findings_spec(self.findings)).save()
        self.case_seq += 1
        self._note({"kind": "saved_case"})

    def use_science(self, science: Science, case: Any = None) -> None:
        """Reason on another graph, about the same drawing and findings.

        Parameters
        ----------
        science : Science
            What answers from now on.
        case : Case, optional
            The case with what changed with the graph (its list of overlays).
        """
        other_places = science.geometry is not self.geometry
        self.science = science
        if case is not None:
            self.case = case
        if other_places:
            self.__dict__.pop("elements", None)
        self.graph_seq += 1
        self.damage = science.damage(self.lesion)
        self.damage_seq += 1
        self._rest()

    @property
    def geometry(self) -> Geometry | None:
        """Geometry of all elements, or None."""
        return self.science.geometry

    @cached_property
    def elements(self) -> ElementMap | None:
        """Elements by voxel, or None without geometry."""
        return ElementMap.build(self.science.index) if self.science.index is not None else None

    def map_of(self, kind: str) -> NDArray[np.uint8] | None:
        """A map over the grid, 0 to 255: ``uncharted`` white matter; None where it is not known."""
        return self.science.map_of(kind)

    # -- work in the background -------------------------------------------------------------------------------------

    def hand(self, down: bool) -> None:
        """The hand is on the table, or off: nothing heavy starts while it is down."""
        self.resting.hold(down)

    def _changed(self, change: Change | None, origin: Mapping[str, Any], entry: dict[str, Any] | None = None) -> None:
        self._lesion = None
        self.last_change, self.last_origin = change, origin
        self.lesion_seq += 1
        self.damage = self.science.damage(self.lesion)
        self.damage_seq += 1
        if entry is not None:
            self._note(entry)
        self._rest()

    # -- findings ---------------------------------------------------------------------------------------------------

    def set_findings(self, findings: Sequence[Any]) -> None:
        """Replace all findings (``byway.knowledge.reasoning.findings.Finding``)."""
        self.findings = tuple(findings)
        self.findings_seq += 1
        self._note({"kind": "findings", "findings": [dict(vars(f)) for f in self.findings]})
        self._rest()

    def set_finding(self, finding: Any) -> None:
        """Put in one finding, in place of the one with the same sign and side."""
        rest = [f for f in self.findings if (f.sign, f.side) != (finding.sign, finding.side)]
        self.set_findings([*rest, finding])

    def drop_finding(self, sign: str, side: str) -> None:
        """Set a sign back to not tested."""
        self.set_findings([f for f in self.findings if (f.sign, f.side) != (sign, side)])

    # -- when the hand rests ----------------------------------------------------------------------------------------

    def _rest(self) -> None:
        lesion, damage, case, findings = self.lesion, self.damage, self.case, self.findings
        if case is None or damage is None:
            return
        self.busy = True
        self.resting.ask(lambda check: self.science.explain(lesion, damage, case, findings, check), self._explained)

    def _explained(self, result: Any) -> None:
        self.busy = self.resting.busy
        if isinstance(result, Exception):
            self.tell(result)
            return
        self.ensemble, self.explanation = result
        self.accounts_seq += 1

    def settle(self, timeout_s: float = 120.0) -> None:
        """Wait until intervals and accounts are there."""
        self.resting.settle(timeout_s)

    # -- odds and ends ----------------------------------------------------------------------------------------------

    def close(self) -> None:
        """Stop the work in the background."""
        if self.following is not None:
            self.following.close()
        self.resting.close()
