"""The accounts panel: rival explanations as cards, on one ledger."""

from byway.widgets.accounts.panel import AccountsPanel

__all__ = ["AccountsPanel"]
