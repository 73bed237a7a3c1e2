"""The head panel."""
