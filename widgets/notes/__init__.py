"""Notes: what people write about a case, where the team stands, and what changed between visits."""

from byway.widgets.notes.panel import NotesPanel

__all__ = ["NotesPanel"]
