"""The slices panel."""
