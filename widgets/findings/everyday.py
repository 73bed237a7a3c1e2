"""Everyday words for signs, so that a search in plain words finds what the clinic calls otherwise."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

__all__ = ["EVERYDAY"]

_SENSATION = ("hypoesthesia", "sensory loss", "tactile", "somatosensory")
_WEAKNESS = ("paresis", "weakness", "plegia")
_SIGHT = ("hemianopia", "quadrantanopia", "blindness", "visual")
_TALK = ("dysarthria", "aphasia", "speech", "mutism", "language")
_MEMORY = ("memory", "amnesia")

# Common practice, no source. The term listed first is the one that the word usually means at the bedside.
EVERYDAY: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "numb": _SENSATION,
        "numbness": _SENSATION,
        "sensation": _SENSATION,
        "sensory": _SENSATION,
        "feeling": _SENSATION,
        "touch": _SENSATION,
        "weak": _WEAKNESS,
        "weakness": _WEAKNESS,
        "paralysis": ("plegia", "paresis", "weakness"),
        "paralysed": ("plegia", "paresis", "weakness"),
        "blind": _SIGHT,
        "blindness": _SIGHT,
        "vision": _SIGHT,
        "sight": _SIGHT,
        "seeing": _SIGHT,
        "speech": _TALK,
        "speaking": _TALK,
        "talk": _TALK,
        "talking": _TALK,
        "face": ("lower facial weakness", "facial"),
        "memory": _MEMORY,
        "forgetful": _MEMORY,
        "forgetting": _MEMORY,
        "clumsy": ("limb ataxia", "ataxia", "loss of coordination", "limb kinetic apraxia"),
        "clumsiness": ("limb ataxia", "ataxia", "loss of coordination", "limb kinetic apraxia"),
        "reading": ("alexia", "dyslexia"),
        "writing": ("agraphia",),
        "understanding": ("auditory comprehension",),
        "naming": ("anomia",),
        "word": ("anomia",),
        "finding": ("anomia",),
    }
)
"""Everyday word to the clinic's terms, as they begin words of a sign's name, key or domain."""
