"""The drawing as panels observe it: edits in, files in and out, one sequence number a change."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import traitlets as t

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.words import word
from byway.widgets.state.casefiles import load_lesion, load_scan, save_drawing, unsaved_edits
from byway.widgets.state.drawing import Change, Drawing, drawing_of
from byway.widgets.state.edits import LEANS_ON_SCANS, apply_edit, bytes_edit
from byway.widgets.state.history import unpacked_indices
from byway.widgets.state.scans import Scans

__all__ = ["DrawingState", "Journal"]

Journal = Callable[[dict[str, Any]], Any]


class DrawingState(t.HasTraits):
    """The part of the state that is drawn on; :class:`~byway.widgets.state.BenchState` reasons about it."""

    lesion_seq = t.Int(0)
    scans_seq = t.Int(0)
    case_seq = t.Int(0)
    notice = t.Unicode("")

    def __init__(self, journal: Journal | None) -> None:
        super().__init__()
        self.journal = journal
        self.case: Any = None
        self.scans = Scans()
        self.drawing = Drawing()
        self.last_change: Change | None = None
        self.last_origin: Mapping[str, Any] = {}
        self._lesion: Lesion | None = None

    def _changed(self, change: Change | None, origin: Mapping[str, Any], entry: dict[str, Any] | None = None) -> None:
        """Announce a change of the drawing (None: another drawing) and journal it."""
        raise NotImplementedError

    @property
    def lesion(self) -> Lesion:
        """The lesion as it is drawn now; frozen."""
        if self._lesion is None:
            spec = self.case.spec.lesion if self.case is not None else None
            self._lesion = self.drawing.lesion(
                drawn_on=spec.drawn_on if spec else None, boundary_mm=spec.boundary_mm if spec else None
            )
        return self._lesion

    def edit(self, edit: Mapping[str, Any], origin: Mapping[str, Any] | None = None) -> Change | None:
        """Make one edit; see :mod:`byway.widgets.state.edits` for the records.

        Parameters
        ----------
        edit : mapping
            A plain record with the edit's name under ``op``.
        origin : mapping, optional
            Who made it (a view's id and its own running number); handed on with the change.

        Returns
        -------
        Change or None
            None where an undo or redo had nowhere to go.

        Raises
        ------
        BywayError
            If the record is not usable; nothing has changed then.
        """
        change = apply_edit(self.drawing, edit, self.scans)
        if change is not None:
            self._changed(change, origin or {}, {"kind": "edit", "edit": self._lasting(edit, change)})
        return change

    def _lasting(self, edit: Mapping[str, Any], change: Change) -> dict[str, Any]:
        """The record to journal: one that leans on a scan is kept as the bytes that it gave."""
        if edit["op"] not in LEANS_ON_SCANS or change.voxels == 0:
            return dict(edit)
        indices = unpacked_indices(self.drawing.history.done[-1].indices)
        return {**bytes_edit(indices, self.drawing.flat[indices]), "label": edit["op"]}

    def undo(self) -> Change | None:
        """Take back the last edit."""
        return self.edit({"op": "undo"})

    def redo(self) -> Change | None:
        """Make the last undone edit again."""
        return self.edit({"op": "redo"})

    def load_lesion(self, lesion: Lesion) -> Change:
        """Replace the drawing by a lesion, as one edit that can be undone."""
        new = drawing_of(lesion)
        indices = np.flatnonzero(new.flat != self.drawing.flat)
        entry = {**bytes_edit(indices, new.flat[indices], new.styles), "label": "load"}
        change = self.drawing.configure("load", new.settings, indices, new.flat[indices])
        self._changed(change, {}, {"kind": "edit", "edit": entry})
        return change

    def load_file(
        self,
        path: Path,
        use: str,
        *,
        label: int | None = None,
        scale: Sequence[float] | None = None,
        sequence: str = "",
        name: str | None = None,
    ) -> str:
        """Load a file in template space, and return a remark for the user.

        Parameters
        ----------
        path : Path
            A NIfTI file.
        use : str
            ``mask`` (or one ``label`` of a label volume; label 0 takes each as a compartment), ``graded`` or ``scan``.
        scale : pair of float, optional
            The values of a graded map that mean no effect and full effect.
        sequence : str
            Of a scan: ``t1``, ``flair``, ``ct`` ...
        name : str, optional
            What the user calls the scan; the file's name where None.

        Raises
        ------
        ImageError
            If the file cannot be used; nothing has changed then.
        """
        if use == "scan":
            scan = load_scan(path, sequence or "unknown")
            self.scans.add(scan if name is None else replace(scan, name=name))
            self.scans_seq += 1
            return "; ".join(scan.notes)
        if use not in ("mask", "graded"):
            raise BywayError(Fault("load", path.name, f"use {use!r}", "mask, graded or scan"))
        ends = None if scale is None else (float(scale[0]), float(scale[1]))
        lesion = load_lesion(path, graded=use == "graded", label=label, scale=ends)
        if use == "graded":  # lies beside what is drawn
            settings = replace(self.drawing.settings, effect_volume=lesion.effect_volume, scale=lesion.scale,
                               notes=lesion.notes)  # fmt: skip
            self._changed(self.drawing.configure("load", settings), {}, {"kind": "graded", "name": path.name})
        else:
            self.load_lesion(lesion)
        return "; ".join(lesion.notes)

    def save_masks(self, folder: Path | None = None) -> list[str]:
        """Write the drawing to the case folder (or another), and what case.yaml says of it; returns the file names.

        Raises
        ------
        BywayError
            If there is no folder, or nothing is drawn.
        CaseError
            If somebody changed case.yaml in between; the masks are written, and both versions of the text are kept.
        """
        place = folder if folder is not None else (self.case.folder if self.case is not None else None)
        if place is None:
            raise BywayError(Fault("no-case", "save", "a drawing without a case folder", "",
                                   "open a case, or give a folder: state.save_masks(folder)"))  # fmt: skip
        written = save_drawing(self.drawing, place)
        if self.case is not None and place == self.case.folder:
            spec = {**self.case.spec.lesion.model_dump(), **written}
            self.case = self.case.with_spec(lesion=spec).save()
            self.case_seq += 1
        self._note({"kind": "saved"})
        return [entry["file"] for entry in written["compartments"]] + [m for m in [written["effect_map"]] if m]

    def recover(self, entries: Iterable[Mapping[str, Any]], author: str) -> int:
        """Make the edits again that a lost kernel had journalled and not saved; each can be undone.

        Parameters
        ----------
        entries : iterable of mapping
            From ``byway.knowledge.cases.journal.read_journal``.
        author : str
            Whose edits.

        Returns
        -------
        int
            How many edits were made again.
        """
        edits = unsaved_edits(entries, author)
        done = sum(apply_edit(self.drawing, edit, self.scans) is not None for edit in edits)
        if done:
            self._changed(None, {})
            self.tell(word("slices.recovered", count=done))
        return done

    def tell(self, what: Exception | str) -> None:
        """Show one line to the user; a fault that is none of byway's own is named by its type."""
        text = str(what) if isinstance(what, str | BywayError) else f"{type(what).__name__}: {what}"
        self.notice = ""
        self.notice = text

    def _note(self, entry: dict[str, Any]) -> None:
        if self.journal is None:
            return
        try:
            self.journal(entry)
        except OSError as error:
            self.tell(BywayError(Fault("journal", "case folder", f"the change was not journalled: {error}", "",
                                       "check the disk, then save")))  # fmt: skip
