"""The accounts panel (rival explanations as cards, on one ledger), and the profile (expected against found)."""

from byway.widgets.accounts.panel import AccountsPanel
from byway.widgets.accounts.profile import ProfilePanel

__all__ = ["AccountsPanel", "ProfilePanel"]
