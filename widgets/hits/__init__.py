"""The hits panel."""
