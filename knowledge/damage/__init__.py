"""Damage of every element by a lesion, with its uncertainty: shares, clearance, ensemble, coverage."""
