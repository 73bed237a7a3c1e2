"""Damage of every element by a lesion, with its uncertainty: shares, clearance, ensemble, coverage.

In flow a lesion and the packed geometry of all elements; out flow flat arrays in the order of
``geometry.element_ids`` (regions first, then segments) and tables with ``key@side`` in the first column. Reasoning
reads them; nothing here knows of functions or signs.
"""
