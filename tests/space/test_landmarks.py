"""Courses and landmarks against published anatomy. Each check names its source and whether it was read or recalled."""

from __future__ import annotations

import numpy as np
import pytest
from places import crossings
from scipy.ndimage import label

from byway.knowledge.space.atlas import Template
from byway.knowledge.space.grid import TEMPLATE_GRID
from byway.knowledge.space.template import template_volume


def places(volume: np.ndarray) -> np.ndarray:
    """Voxel centres of a volume, mm."""
    return TEMPLATE_GRID.to_mm(np.argwhere(volume))


def test_the_temporal_loop_reaches_forward_as_far_as_published(template: Template) -> None:
    """The loop's tip lies 22 to 51 mm behind the temporal pole.

    Dissection 27 mm (22-37; Ebeling and Reulen 1988), tractography 44 mm (34-51; Nilsson et al. 2007), patients 24-43
    mm (Yogarajah et al. 2009); ranges as read in a published table and two abstracts.
    """
    grey = places(template_volume("gm") > 0.5)
    lobe = grey[(grey[:, 0] < -28) & (grey[:, 2] < -28) & (grey[:, 2] > -45) & (grey[:, 1] < 32)]
    pole_y = lobe[:, 1].max()
    tips = np.array([line[:, 1].max() for line in template.streamlines("optic_radiation.temporal_loop", "left")])
    assert 22 <= pole_y - np.percentile(tips, 95) <= 51
    assert 22 <= pole_y - template.core_line("optic_radiation.temporal_loop", "left")[:, 1].max() <= 51


def test_parts_of_the_optic_radiation_are_stacked(template: Template) -> None:
    """Beside the atrium (y = -40) loop, central and dorsal parts lie from below upward (Ebeling and Reulen 1988)."""
    heights = [
        crossings([template.core_line(f"optic_radiation.{part}", "left")], 1, -40)[0, 2]
        for part in ("temporal_loop", "central", "dorsal")
    ]
    assert heights == sorted(heights)
    assert heights[2] - heights[0] > 8


def test_corticospinal_fibres_run_in_the_posterior_half_of_the_posterior_limb(template: Template) -> None:
    """At mid-thalamic level (z = 9) the bundle's mean lies behind the middle of the posterior limb.

    Hand fibres run in the posterior part of the limb (Kim et al. 2008, NeuroReport 19:817-820, read as an abstract).
    The limb is measured on the template: white matter between thalamus and lentiform nucleus from its corner at the
    genu (about y = -1) to its hind end (about y = -27).
    """
    fibres = crossings(template.streamlines("corticospinal.posterior_limb", "left"), 2, 9)
    front_y, hind_y = -1.0, -27.0
    assert fibres[:, 1].mean() < (front_y + hind_y) / 2
    assert (fibres[:, 1] < front_y).all()
    assert np.percentile(fibres[:, 1], 5) > hind_y


def test_the_capsular_bundle_lies_where_histology_has_it(template: Template) -> None:
    """At z = 8 at least 80 % of fibres lie in x -30 to -14, y -28 to -6.

    A cytoarchitectonic volume of the tract spans x -16 to -25, y -8 to -24 at half probability there (Buergel et al.
    2006, NeuroImage 29:1092-1105, from memory; span measured on the atlas); 4 mm are allowed on each side.
    """
    fibres = crossings(template.streamlines("corticospinal.posterior_limb", "left"), 2, 8)
    inside = (np.abs(fibres[:, 0] + 20.5) < 8.5) & (np.abs(fibres[:, 1] + 16) < 12)
    assert inside.mean() > 0.8


@pytest.mark.parametrize("height_mm", [30, 35, 40, 45])
def test_arm_fibres_run_lateral_to_leg_fibres_in_the_corona(template: Template, height_mm: float) -> None:
    """In the corona radiata the arm part lies lateral to and in front of the leg part.

    Order of the motor strip, Penfield and Boldrey 1937, Brain 60:389-443 (from memory); in the capsule hand fibres
    lie lateral to foot fibres (Qian and Tan 2017, Brain and Behavior 7:e00629, abstract read).
    """
    arm = crossings(template.streamlines("corticospinal.corona_arm", "left"), 2, height_mm).mean(axis=0)
    leg = crossings(template.streamlines("corticospinal.corona_leg", "left"), 2, height_mm).mean(axis=0)
    assert arm[0] < leg[0] - 2
    assert arm[1] > leg[1]


def test_the_anterior_commissure_crosses_at_its_place(template: Template) -> None:
    """It crosses the midline at y 0 to 4, z -6 to 0: the origin of Talairach space is about (0, 3, -4) in MNI space.

    Talairach and Tournoux 1988 place the origin at the commissure; its MNI place is common practice (from memory).
    """
    crossing = crossings(template.streamlines("anterior_commissure.posterior_limb"), 0, 0.0).mean(axis=0)
    assert 0 <= crossing[1] <= 4
    assert -5 <= crossing[2] <= 0


def test_callosal_parts_cross_in_their_order(template: Template) -> None:
    """From front to back: genu, anterior body, posterior body, isthmus, splenium; all inside the callosum.

    Order: Hofer and Frahm 2006, NeuroImage 32:989-994 (abstract read); primary motor fibres cross between the half
    and two thirds of its length there.
    """
    parts = ("genu_forceps_minor", "anterior_body", "posterior_body", "isthmus", "splenium_forceps_major")
    crossing = {part: crossings(template.streamlines(f"corpus_callosum.{part}"), 0, 0.0) for part in parts}
    means = [crossing[part][:, 1].mean() for part in parts]
    assert means == sorted(means, reverse=True)
    plane = template_volume("wm")[98] > 0.5
    pieces, _ = label(plane)
    callosum = pieces == 1 + np.argmax(np.bincount(pieces.ravel())[1:])
    y = np.argwhere(callosum)[:, 0] - 134
    motor = (y.max() - means[2]) / (y.max() - y.min())
    assert 0.5 <= motor <= 0.667
    for points in crossing.values():
        inside = [plane[round(p[1]) + 134, round(p[2]) + 72] for p in points]
        assert np.mean(inside) > 0.85


def test_the_long_arcuate_bends_behind_the_sylvian_fissure(template: Template) -> None:
    """Its hind turn lies between y -55 and -35, and its horizontal part lateral to the corona radiata's arm fibres.

    Catani, Jones, ffytche 2005, Annals of Neurology 57:8-16 (abstract read).
    """
    arcuate = template.core_line("arcuate_fasciculus.long_ventral", "left")
    assert -55 < arcuate[:, 1].min() < -35
    level = crossings([arcuate], 1, -20)[0]
    corona = crossings(template.streamlines("corticospinal.corona_arm", "left"), 2, level[2]).mean(axis=0)
    assert level[0] < corona[0] - 3
