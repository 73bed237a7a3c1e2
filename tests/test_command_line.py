"""The command line: results to stdout, one clear line and exit code 2 for bad input, never a traceback."""

from __future__ import annotations

import gzip
import json
import re
from pathlib import Path

import nbformat
import nibabel as nib
import numpy as np
import pytest
from numpy.typing import NDArray

from byway.knowledge import read_lesion
from byway.knowledge.__main__ import main
from byway.knowledge.cases.making import bench_notebook, new_case
from byway.knowledge.lesion.images import write_mask
from byway.knowledge.lesion.shapes import ellipsoid_mask
from byway.knowledge.space.grid import TEMPLATE_GRID

DEMO = Path(__file__).parents[1] / "notebooks" / "cases" / "first_case"
AFFINE = TEMPLATE_GRID.affine


def run(capsys: pytest.CaptureFixture[str], *arguments: object) -> tuple[int, str, str]:
    """Run a command in this process: exit code, stdout, stderr."""
    code = main([str(argument) for argument in arguments])
    out, err = capsys.readouterr()
    return code, out, err


@pytest.fixture
def mask(tmp_path: Path) -> Path:
    """A small mask in the left hemisphere."""
    return write_mask(tmp_path / "mask.nii.gz", ellipsoid_mask((-40, -20, 26), (8, 12, 8)))


def test_explain_in_words_json_and_report(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The demo case explains; the JSON has the accounts; the report is one file that asks for nothing outside."""
    code, out, err = run(capsys, "explain", DEMO / "case.yaml", "--report", tmp_path / "out.html")
    assert code == 0
    assert "segment_disconnection" in out
    assert "no diagnosis" in err
    page = (tmp_path / "out.html").read_text()
    assert "http://" not in page
    assert "https://" not in page
    assert "no diagnosis" in page
    code, out, _ = run(capsys, "explain", DEMO, "--json")
    assert code == 0
    assert json.loads(out)["accounts"][0]["kind"] == "segment_disconnection"


def test_damage_prints_what_is_hit(mask: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A mask's table names the arcuate's long segment, whose anatomy it rests on, and the uncharted share."""
    code, out, _ = run(capsys, "damage", mask, "--csv", tmp_path / "t.csv")
    assert code == 0
    assert "arcuate_fasciculus.long_ventral@left" in out
    assert "uncharted_share" in out
    assert "template" in out
    assert (tmp_path / "t.csv").read_text().startswith("element,kind,name,side,share,low,high")


def test_new_makes_a_case_that_explains(mask: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A case made from a mask opens, and its lesion is the mask bit for bit; a full folder is refused."""
    code, _, _ = run(capsys, "new", mask, tmp_path / "case")
    assert code == 0
    saved = next((tmp_path / "case").glob("*_mask.nii.gz"))
    assert np.array_equal(read_lesion(saved).mask, read_lesion(mask).mask)
    assert run(capsys, "explain", tmp_path / "case")[0] == 0
    code, _, err = run(capsys, "new", mask, tmp_path / "case")
    assert code == 2
    assert "nothing was written" in err


def _save(path: Path, data: NDArray[np.generic], affine: NDArray[np.float64] | None = AFFINE) -> Path:
    image = nib.Nifti1Image(data, affine)
    if affine is None:
        image.header["sform_code"] = image.header["qform_code"] = 0
    nib.save(image, path)
    return path


def _ball(centre: tuple[float, float, float] = (-40, -20, 26)) -> NDArray[np.uint8]:
    return ellipsoid_mask(centre, (8, 8, 8)).astype(np.uint8)


def _bad_masks(folder: Path) -> dict[str, tuple[Path, str]]:
    ball = _ball()
    whole = _save(folder / "whole.nii.gz", ball).read_bytes()
    torn = folder / "torn.nii.gz"
    torn.write_bytes(whole[: len(whole) // 2])
    (folder / "text.nii").write_text("not an image")
    (folder / "text.nii.gz").write_bytes(gzip.compress(b"not an image"))
    nan, negative, labels = ball.astype(np.float32), ball.astype(np.float32), ball.copy()
    nan[ball > 0] = np.nan
    negative[ball > 0] = -1
    labels[100:, :, :][ball[100:, :, :] > 0] = 1
    labels[ball > 0] = np.where(np.indices(ball.shape)[0][ball > 0] > 58, 3, 2)
    outside = ball.copy()
    outside[:25, :25, :25] = 1
    shifted = AFFINE.copy()
    shifted[:3, 3] += 60
    return {
        "no file": (folder / "none.nii.gz", "none.nii.gz"),
        "not a NIfTI": (folder / "text.nii", "text.nii"),
        "gzip of no NIfTI": (folder / "text.nii.gz", "text.nii.gz"),
        "torn gzip": (torn, "torn.nii.gz"),
        "four volumes": (_save(folder / "four.nii.gz", np.stack([ball, ball], axis=3)), "2 volumes|volumes"),
        "empty": (_save(folder / "empty.nii.gz", np.zeros_like(ball)), "empty"),
        "NaN": (_save(folder / "nan.nii.gz", nan), "not finite"),
        "negative": (_save(folder / "neg.nii.gz", negative), "negative"),
        "labels": (_save(folder / "labels.nii.gz", labels), r"2.*3.*on the command line --label"),
        "no forms": (_save(folder / "forms.nii.gz", ball, None), "sform"),
        "other field of view": (_save(folder / "fov.nii.gz", ball, shifted), "mm"),
        "outside the brain": (_save(folder / "out.nii.gz", outside), "outside the brain"),
    }


@pytest.mark.parametrize("which", ["no file", "not a NIfTI", "gzip of no NIfTI", "torn gzip", "four volumes", "empty",
                                   "NaN", "negative", "labels", "no forms", "other field of view",
                                   "outside the brain"])  # fmt: skip
def test_bad_masks_get_one_clear_line(which: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Each bad mask: exit code 2, one line on stderr that names the file, nothing on stdout, nothing written."""
    path, said = _bad_masks(tmp_path)[which]
    before = sorted(tmp_path.iterdir())
    code, out, err = run(capsys, "new", path, tmp_path / "case")
    assert code == 2
    assert out == ""
    assert len(err.strip().splitlines()) == 1
    assert path.name in err
    assert re.search(said, err), err
    assert sorted(tmp_path.iterdir()) == before


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ("sign: repetition_defecit", "repetition_deficit"),
        ("sign: \"HP:9999999\"", "HP:9999999"),
        ("grade: bad", "case.yaml:9"),
        ("sign: hemianopia", "did you mean homonymous_hemianopia"),
        ("side: left", "expected side none; this sign has no side: leave `side` out"),
    ],
)
def test_bad_cases_get_one_clear_line(
    change: str, said: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """An unknown sign suggests the nearest; a wrong type names its line; the file is left as it is."""
    finding = {"sign": "repetition_deficit", "side": "none", "grade": "mild"}
    key, _, value = change.partition(": ")
    finding[key] = value
    text = ("stage: acute\nlesion:\n  compartments:\n  - name: core\n    kind: core\n    effect: 1.0\n"
            "    shapes: [{shape: sphere, centre_mm: [-40, -20, 26], radii_mm: [8]}]\nfindings:\n"
            f"- {{{', '.join(f'{k}: {v}' for k, v in finding.items())}}}\n")  # fmt: skip
    path = tmp_path / "case.yaml"
    path.write_text(text)
    code, _, err = run(capsys, "explain", path)
    assert code == 2
    assert said in err
    assert len(err.strip().splitlines()) == 1
    assert path.read_text() == text


def test_no_draws_are_refused_in_words(capsys: pytest.CaptureFixture[str]) -> None:
    """Zero draws get one line that says so, not the settings as code."""
    code, _, err = run(capsys, "explain", DEMO, "--draws", 0)
    assert code == 2
    assert "0 draws; expected at least one draw" in err
    assert "EnsembleSettings" not in err


def test_a_bad_overlay_is_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """An overlay with a YAML tag is a fault with file and line, and the check says so by its exit code."""
    (tmp_path / "o.yaml").write_text("name: !!python/name:os.system x\n")
    code, out, _ = run(capsys, "graph", "check", "--overlay", tmp_path / "o.yaml")
    assert code == 1
    assert "o.yaml:1" in out


def test_graph_check_and_table(capsys: pytest.CaptureFixture[str]) -> None:
    """The curated graph checks clean with its counts; the table has a row for every sign."""
    code, out, _ = run(capsys, "graph", "check")
    assert code == 0
    assert "claims" in out
    code, out, _ = run(capsys, "graph", "table")
    assert code == 0
    assert "Non-fluent" in out or "nonfluent_speech" in out


def test_archive_goes_out_and_comes_back(mask: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A case packs into one file and unpacks into a new folder that explains the same."""
    assert run(capsys, "new", mask, tmp_path / "case")[0] == 0
    assert run(capsys, "archive", "pack", tmp_path / "case", tmp_path / "case.zip")[0] == 0
    assert run(capsys, "archive", "unpack", tmp_path / "case.zip", tmp_path / "back")[0] == 0
    assert (tmp_path / "back" / "case.yaml").read_bytes() == (tmp_path / "case" / "case.yaml").read_bytes()


def test_signs_lists_keys_and_sides(capsys: pytest.CaptureFixture[str]) -> None:
    """Words narrow the list of signs; every row has key and sides; a word that no sign has is one line and exit 2."""
    code, out, _ = run(capsys, "signs", "weakness")
    assert code == 0
    assert "arm_weakness left or right" in " ".join(out.split())
    assert "anomia" not in out
    code, _, err = run(capsys, "signs", "aphasiia")
    assert code == 2
    assert len(err.strip().splitlines()) == 1


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--foo"], "no option '--foo'; expected open, explain"),
        (["explain", "x", "--reprt", "y"], "did you mean --report"),
        ([], "no command; expected open, explain"),
        (["explain", str(DEMO), "--summary"], "--summary without a report"),
    ],
)
def test_misunderstood_words_get_one_line(words: list[str], said: str, capsys: pytest.CaptureFixture[str]) -> None:
    """An option or command that does not exist, or makes no sense, gets one line that says what would."""
    code, _, err = run(capsys, *words)
    assert code == 2
    assert said in err
    assert len(err.strip().splitlines()) == 1


def test_new_says_what_it_did_to_the_mask(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A mask on a 2 mm grid is resampled into the new case, and stderr says so."""
    affine = AFFINE.copy()
    affine[:3, :3] *= 2
    _save(tmp_path / "coarse.nii.gz", np.ascontiguousarray(_ball()[::2, ::2, ::2]), affine)
    code, _, err = run(capsys, "new", tmp_path / "coarse.nii.gz", tmp_path / "case")
    assert code == 0
    assert "resampled from a 2 mm grid" in err


def test_a_case_folder_gets_a_notebook_for_its_bench(mask: Path, tmp_path: Path) -> None:
    """The notebook that ``byway open CASE`` opens shows the bench on that folder, and is not written over."""
    folder = new_case(tmp_path / "case", mask).folder
    path = bench_notebook(folder)
    book = nbformat.read(path, as_version=4)
    nbformat.validate(book)
    assert book.cells[0].source.endswith('bench(".")')
    path.write_text("mine")
    assert bench_notebook(folder).read_text() == "mine"
