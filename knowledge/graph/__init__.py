"""The typed graph: records, curated files, overlays, checks and exports. Knows no geometry and no damage.

Curated text flows in; a frozen ``Graph`` and networks of functions flow out. From left
to right: records, content (records of all layers), grammar and files (text to records), references and networks
(chains to elements with sides), emit, overlays and layers (what is laid on the base), joins and checks (the rules), the
typed graph, loading, edits (undo), tables, export, rivals, and commands for the command line. Other rooms take
``load_graph``, ``Graph``, ``function_networks`` and ``check_graph``; editors take ``Editing``.
"""
