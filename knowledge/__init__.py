"""byway.knowledge: graph, geometry, damage, capacity, accounts and cases. Never imports byway.widgets.

Rooms, from left to right; each imports only from those before it: ``graph``, ``space``, ``lesion``, ``damage``,
``reasoning``, ``cases``. The names below are what most people need.
"""

from byway.knowledge.cases.case import Case, open_case
from byway.knowledge.cases.course import Course, course_of_case
from byway.knowledge.cases.explaining import damage_of, explain
from byway.knowledge.cases.making import new_case
from byway.knowledge.cases.report import write_report
from byway.knowledge.cases.similar import similar_to
from byway.knowledge.faults import BywayError
from byway.knowledge.graph.graph import Graph
from byway.knowledge.graph.loading import load_graph
from byway.knowledge.lesion.images import read_lesion
from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.space.atlas import Template, load_template

__all__ = [
    "BywayError",
    "Case",
    "Course",
    "Explanation",
    "Graph",
    "Lesion",
    "Template",
    "course_of_case",
    "damage_of",
    "explain",
    "load_graph",
    "load_template",
    "new_case",
    "open_case",
    "read_lesion",
    "similar_to",
    "write_report",
]
