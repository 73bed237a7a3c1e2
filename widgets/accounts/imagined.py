"""Another lesion than the one at hand: grown or shrunk, its oedema resolving."""

from __future__ import annotations

from dataclasses import replace

from byway.knowledge.lesion.lesion import Lesion
from byway.knowledge.lesion.morphology import grow_mm, shrink_mm

__all__ = ["imagined"]


def imagined(lesion: Lesion, growth_mm: float = 0.0, oedema_share: float = 1.0) -> Lesion:
    """A lesion changed for the sake of argument.

    Parameters
    ----------
    lesion : Lesion
        As it is. A graded effect map stays as it is.
    growth_mm : float
        How far the edge of every compartment but oedema moves out; negative: in. One that vanishes is left out.
    oedema_share : float
        What is left of the oedema's effect, 0 to 1.
    """
    parts = []
    for part in lesion.compartments:
        if part.kind == "oedema":
            changed = replace(part, effect=part.effect * oedema_share)
        elif growth_mm > 0:
            changed = replace(part, mask=grow_mm(part.mask, growth_mm))
        elif growth_mm < 0:
            changed = replace(part, mask=shrink_mm(part.mask, -growth_mm))
        else:
            changed = part
        if changed.mask.any():
            parts.append(changed)
    return replace(lesion, compartments=tuple(parts))
