"""The accounts panel."""
