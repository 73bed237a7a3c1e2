"""The reviewed text of the graph, one folder a kind; read by byway.knowledge.graph.files."""
