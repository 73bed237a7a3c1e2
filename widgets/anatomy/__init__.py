"""Where along a segment the damage sits, and the template's anatomy beside the case's own."""

from byway.widgets.anatomy.along import AlongPanel
from byway.widgets.anatomy.anatomies import AnatomiesPanel

__all__ = ["AlongPanel", "AnatomiesPanel"]
