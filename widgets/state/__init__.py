"""The one observable case that all panels share.

Strokes, findings and settings flow in; sequence numbers flow out, and a panel reads what they announce. The drawing is
edited here by plain, journalled edits (``raster``, ``edits``, ``reshape``, ``drawing``, ``history``, observed through
``drawing_state``); the reasoning is asked of ``byway.knowledge`` when the hand rests (``resting``, ``science``).
Panels may import this room; it knows no panel.
"""

from byway.widgets.state.bench_state import BenchState

__all__ = ["BenchState"]
