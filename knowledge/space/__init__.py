"""Space: the template's grid and volumes, and where every region and segment lies on it.

In flow the records of regions and segments (``graph``) and, from a site, its own atlas or a person's tractogram.
Out flows one :class:`~byway.knowledge.space.geometry.Geometry`: parcels and streamlines in flat arrays, with the
spread and the anatomy that each element rests on. Nothing here knows of lesions, findings or screens.
"""

__all__: list[str] = []
