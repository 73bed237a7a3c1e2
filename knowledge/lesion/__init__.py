"""The lesion: compartments, shapes, effect map, morphology and image files."""
