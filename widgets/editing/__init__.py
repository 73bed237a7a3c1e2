"""The editing panel: records changed, retired and disputed in an overlay of one's own; review; rival models; coverage.

``EditingPanel`` is the widget. ``session`` holds one author's overlay on the open case, ``forms`` what can be edited,
``placing`` which field a fault belongs to, ``effects`` the ranking before and after, ``sketch`` the course in the hand,
``visits`` an overlay from elsewhere, ``rivals`` the models, ``wire`` what the browser is told.
"""

from byway.widgets.editing.panel import EditingPanel

__all__ = ["EditingPanel"]
