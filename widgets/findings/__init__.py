"""The findings panel: what was seen, what was looked for and absent, what was not tested."""

from byway.widgets.findings.panel import FindingsPanel

__all__ = ["FindingsPanel"]
