"""The findings panel."""
