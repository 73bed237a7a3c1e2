"""Space: the template grid and volumes, parcels, courses and bundles, own atlases, and their cache."""
