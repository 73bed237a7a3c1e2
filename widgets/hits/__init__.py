"""The hits panel: what the lesion reaches."""

from byway.widgets.hits.panel import HitsPanel

__all__ = ["HitsPanel"]
