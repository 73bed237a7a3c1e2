"""The lesion: compartments, shapes, effect map, morphology and image files.

In flow masks on the template grid, shapes in MNI mm and NIfTI files; out flow frozen :class:`Lesion` values and mask
files. The rooms to the right (damage, reasoning, cases) read lesions; nothing here knows of parcels or bundles.
"""
