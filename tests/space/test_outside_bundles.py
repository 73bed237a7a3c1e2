"""Template bundles against real ones: five people's bundles that the dipy wheel carries.

Data: ``minimal_bundles.zip`` in dipy's wheel, 50 streamlines each of the left arcuate, the right corticospinal tract
and the posterior callosal fibres of five people, in native space. One affine a person is fitted on all three bundles
together (Garyfallidis et al. 2015, NeuroImage 117:124-140); distances are mean direct-flip distances (MDF; Garyfallidis
et al. 2012, Frontiers in Neuroscience 6:175). Both citations from memory.
"""

from __future__ import annotations

import zipfile
from collections.abc import Callable
from pathlib import Path

import dipy.data
import nibabel as nib
import numpy as np
import pytest
from dipy.align.streamlinear import BundleMinDistanceMetric, StreamlineLinearRegistration
from dipy.tracking.distances import bundles_distances_mdf
from dipy.tracking.streamline import set_number_of_points, transform_streamlines

from byway.knowledge.space.atlas import Template
from byway.knowledge.space.joining import joined_streamlines

NEAR_MM = 10.0
POINTS = 20
PEOPLE = ("sub_1", "sub_2", "sub_3", "sub_4", "sub_5")
BUNDLES = ("AF_L", "CST_R", "CC_ForcepsMajor")
# Stops the search where a step no longer pays, so that one fit takes about a second.
QUICK = {"maxcor": 10, "ftol": 1e-6, "gtol": 1e-4, "eps": 1e-6, "maxiter": 60}

Lines = list[np.ndarray]


def even(lines: Lines, points: int = POINTS) -> Lines:
    """Streamlines with the same number of points at equal distances."""
    return [
        np.asarray(line, np.float32) for line in set_number_of_points([np.asarray(x, float) for x in lines], points)
    ]


def some(lines: Lines, count: int = 20) -> Lines:
    """Evenly chosen streamlines."""
    return [lines[int(i)] for i in np.linspace(0, len(lines) - 1, count)]


def fitting(freedom: str) -> StreamlineLinearRegistration:
    """A streamline registration of so many degrees of freedom."""
    return StreamlineLinearRegistration(metric=BundleMinDistanceMetric(num_threads=1), x0=freedom, options=QUICK)


@pytest.fixture(scope="module")
def ours(template: Template) -> dict[str, Lines]:
    """Whole template streamlines of the three pathways."""
    whole: Lines = []
    for corona in ("corona_leg", "corona_arm"):
        names = (corona, "posterior_limb", "peduncle", "pons", "pyramid")
        whole += joined_streamlines([template.streamlines(f"corticospinal.{name}", "right") for name in names])
    arcuate: Lines = []
    for name in ("long_ventral", "long_dorsal"):
        arcuate += template.streamlines(f"arcuate_fasciculus.{name}", "left")
    callosal = template.streamlines("corpus_callosum.splenium_forceps_major")
    return {"AF_L": even(arcuate), "CST_R": even(whole), "CC_ForcepsMajor": even(callosal)}


@pytest.fixture(scope="module")
def aligned(ours: dict[str, Lines], tmp_path_factory: pytest.TempPathFactory) -> dict[str, dict[str, Lines]]:
    """Each person's bundles in template space, by one affine fitted on all three."""
    folder = tmp_path_factory.mktemp("bundles")
    archive = Path(dipy.data.__file__).parent / "files" / "minimal_bundles.zip"
    zipfile.ZipFile(archive).extractall(folder)
    fixed = [line for name in BUNDLES for line in even(some(ours[name]), 12)]
    people = {}
    for person in PEOPLE:
        read = {
            name: even(list(nib.streamlines.load(str(folder / person / f"{name}.trk")).streamlines)) for name in BUNDLES
        }
        moving = [line for name in BUNDLES for line in even(some(read[name]), 12)]
        rigid = fitting("rigid").optimize(fixed, moving)
        affine = fitting("affine").optimize(fixed, moving, mat=rigid.matrix)
        people[person] = {
            name: [np.asarray(line, np.float32) for line in transform_streamlines(lines, affine.matrix)]
            for name, lines in read.items()
        }
    return people


def near_share(real: Lines, template_lines: Lines) -> float:
    """Share of real streamlines within 10 mm (MDF) of some template streamline."""
    return float((bundles_distances_mdf(real, template_lines).min(axis=1) <= NEAR_MM).mean())


def test_real_streamlines_lie_near_the_template(
    ours: dict[str, Lines], aligned: dict[str, dict[str, Lines]], record_property: Callable[[str, object], None]
) -> None:
    """On average over people and bundles at least 80 %, and of every bundle at least 70 %, lie within 10 mm."""
    shares = np.array([[near_share(aligned[person][name], ours[name]) for name in BUNDLES] for person in PEOPLE])
    record_property("within_10_mm", dict(zip(BUNDLES, shares.mean(axis=0).round(3).tolist(), strict=True)))
    print(
        "within 10 mm:", dict(zip(BUNDLES, shares.mean(axis=0).round(3).tolist(), strict=True)), shares.mean().round(3)
    )
    assert shares.mean() >= 0.80
    assert shares.mean(axis=0).min() >= 0.70


def test_which_other_pathways_real_bundles_come_near(
    template: Template, aligned: dict[str, dict[str, Lines]], record_property: Callable[[str, object], None]
) -> None:
    """Reported: segments within 10 mm of real bundles. The arcuate comes near no projection or limbic segment."""
    near: dict[str, dict[str, float]] = {name: {} for name in BUNDLES}
    for element in template.geometry.segment_ids:
        key, _, side = element.partition("@")
        lines = even(some(template.streamlines(key, side), 12))
        for name in BUNDLES:
            share = float(np.mean([near_share(aligned[person][name], lines) for person in PEOPLE]))
            if share > 0.05:
                near[name][element] = round(share, 2)
    for name, found in near.items():
        ordered = dict(sorted(found.items(), key=lambda each: -each[1]))
        record_property(f"near_{name}", ordered)
        print(name, ordered)
    assert max(near["AF_L"], key=near["AF_L"].__getitem__).startswith(("arcuate_fasciculus.long", "slf_"))
    assert all(element.endswith("@left") for element in near["AF_L"])
    assert not any(element.startswith(("optic", "corticospinal", "cingulum", "fornix")) for element in near["AF_L"])
    assert all(element.endswith("@midline") for element in near["CC_ForcepsMajor"])
