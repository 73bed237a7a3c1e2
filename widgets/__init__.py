"""byway.widgets: the bench and its panels. They hold no science; each draws what byway.knowledge says.

``bench(case)`` arranges all panels around one case. Each panel also stands alone in a cell, on a
:class:`~byway.widgets.state.BenchState` or on what ``explain(case)`` returns.
"""

from byway.widgets.accounts import AccountsPanel, ProfilePanel
from byway.widgets.bench import Bench, bench
from byway.widgets.editing import EditingPanel
from byway.widgets.findings import FindingsPanel
from byway.widgets.graph import GraphPanel
from byway.widgets.hits import HitsPanel
from byway.widgets.numbers import number_named
from byway.widgets.routes import RoutesPanel
from byway.widgets.slices import SlicesPanel
from byway.widgets.state import BenchState

__all__ = [
    "AccountsPanel",
    "Bench",
    "BenchState",
    "EditingPanel",
    "FindingsPanel",
    "GraphPanel",
    "HitsPanel",
    "ProfilePanel",
    "RoutesPanel",
    "SlicesPanel",
    "bench",
    "number_named",
]
