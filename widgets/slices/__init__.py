"""The slices panel: the light table on which the lesion is drawn.

The Python class answers messages and announces changes; the ES modules beside it draw and paint. It shows one
:class:`~byway.widgets.state.BenchState` and knows no other panel.
"""

from byway.widgets.slices.panel import SlicesPanel

__all__ = ["SlicesPanel"]
