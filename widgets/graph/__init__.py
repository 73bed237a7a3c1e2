"""The graph panel."""
