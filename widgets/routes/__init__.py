"""The routes panel."""
