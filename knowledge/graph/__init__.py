"""The typed graph: records, curated files, overlays, checks and exports. Knows no geometry and no damage."""
