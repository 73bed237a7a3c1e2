"""The notes panel."""
