"""The routes panel: a function's network as bands, with its bottleneck."""

from byway.widgets.routes.panel import RoutesPanel

__all__ = ["RoutesPanel"]
