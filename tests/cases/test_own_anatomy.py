"""A case's own anatomy: what it replaces, what rests on it, what is said of it, and what is refused."""

from __future__ import annotations

import json
from pathlib import Path

import nibabel as nib
import numpy as np
import pytest
from own_case import LONG, MIDDLE, SHIFT_MM, own_case, write_own

from byway.knowledge import explain, open_case
from byway.knowledge.__main__ import main
from byway.knowledge.cases.anatomies import ANATOMIES_COLUMNS, anatomies_of_case
from byway.knowledge.cases.archive import KEPT, pack_case, unpack_case
from byway.knowledge.cases.case import Case
from byway.knowledge.cases.desk import Desk, desk_for, desk_own, desk_with
from byway.knowledge.cases.explaining import damage_of, desk_of
from byway.knowledge.cases.files import read_case, write_case
from byway.knowledge.cases.own import KINDS, folder_layer
from byway.knowledge.cases.privacy import identifying_traces
from byway.knowledge.cases.report import report_html
from byway.knowledge.cases.similar import similar_to
from byway.knowledge.cases.tables import case_tables
from byway.knowledge.cases.wording import explanation_text
from byway.knowledge.faults import BywayError
from byway.knowledge.reasoning.explain import Explanation
from byway.knowledge.space.atlas import Template
from byway.knowledge.space.grid import TEMPLATE_GRID


@pytest.fixture(scope="module")
def case(template: Template, tmp_path_factory: pytest.TempPathFactory) -> Case:
    """The invented case with its own bundles."""
    return own_case(tmp_path_factory.mktemp("own") / "case", template)


@pytest.fixture(scope="module")
def desk(case: Case) -> Desk:
    """Its desk."""
    return desk_of(case, progress=False)


@pytest.fixture(scope="module")
def explanation(case: Case, desk: Desk) -> Explanation:
    """Its explanation, on few draws."""
    return explain(case, desk=desk, draws=20)


def changed(case: Case, tmp_path: Path, old: str, new: str) -> Case:
    """A copy of the case's text with something changed; the files stay where they are."""
    text = case.path.read_text()
    assert old in text
    (tmp_path / "case.yaml").write_text(text.replace(old, new))
    return open_case(tmp_path)


def test_native_bundles_land_where_the_person_has_them(case: Case, desk: Desk, template: Template) -> None:
    """Led through the affine, each bundle lies at its shift from the template's, within half a millimetre."""
    assert desk.usual is not None
    for element, shift in SHIFT_MM.items():
        own, usual = (np.concatenate(t.streamlines(element)).mean(axis=0) for t in (desk.template, template))
        np.testing.assert_allclose(own - usual, shift, atol=0.5)
    whose = dict(zip(desk.template.geometry.element_ids, desk.template.geometry.anatomy, strict=True))
    assert {element for element, name in whose.items() if name == "P-07"} == {LONG, MIDDLE}


def test_the_desk_is_read_once_and_again_when_a_file_changes(template: Template, tmp_path: Path) -> None:
    """The same desk comes back until a file of the anatomy is another."""
    case = own_case(tmp_path / "case", template)
    first = desk_of(case, progress=False)
    assert desk_of(case, progress=False) is first
    table = case.folder / "anatomy" / "mapping.csv"
    table.write_text(f"element,file\n{LONG},long.trk\n")
    again = desk_of(case, progress=False)
    assert again is not first
    assert again.template.geometry.anatomy.count("P-07") == 1


def test_a_case_without_own_anatomy_has_the_usual_desk(tmp_path: Path) -> None:
    """Nothing is laid on, so the very desk is returned."""
    desk = desk_for(progress=False)
    assert desk_own(desk, ()) is desk
    assert desk.usual is None


def test_damage_and_explanation_rest_on_it_and_say_so(case: Case, explanation: Explanation, desk: Desk) -> None:
    """The lesion sits on the template's course, 8 mm under this person's: far less is severed than by the template."""
    row = explanation.damage.set_index("element").loc[LONG]
    usual = damage_of(case.lesion, desk=desk.usual, draws=20).set_index("element").loc[LONG]
    assert row.anatomy == "P-07"
    assert usual.anatomy == "template"
    assert row.share < usual.share - 0.3
    assert json.loads(explanation.to_json())["damage"]
    text = explanation_text(case, explanation)
    assert "P-07 (2 elements) and the template's, not this person's" in text
    assert f"[{LONG}], by P-07" in text


def test_the_two_stand_side_by_side(case: Case, desk: Desk) -> None:
    """One row an own element: both shares, their difference, and how far apart the courses lie."""
    table = anatomies_of_case(case, desk=desk)
    assert tuple(table.columns) == ANATOMIES_COLUMNS
    assert set(table.element) == {LONG, MIDDLE}
    np.testing.assert_allclose(table.difference, table.own_share - table.share)
    rows = table.set_index("element")
    assert rows.difference[LONG] < -0.3
    assert 2 < rows.apart_mm[LONG] <= 8.5
    assert rows.apart_mm[MIDDLE] < 2
    assert table.element.tolist()[0] == LONG


def test_report_and_tables_show_it(case: Case, explanation: Explanation) -> None:
    """The report has a column for whose anatomy, and the comparison; the tables hold the same comparison."""
    page = report_html(case, explanation)
    assert "<td>P-07</td>" in page
    assert f'data-name="anatomies/{LONG}/own_share"' in page
    assert "P-07 (2 elements)" in page
    assert case_tables(case, explanation)["anatomies"].element.tolist()[0] == LONG


def test_likeness_to_other_people_rests_on_the_template(case: Case, template: Template, tmp_path: Path) -> None:
    """The same lesion without own bundles is the same by damage."""
    other = tmp_path / "other"
    other.mkdir()
    (other / "case.yaml").write_text(case.path.read_text().partition("anatomy:")[0])
    assert similar_to(case, tmp_path).by_damage.tolist() == pytest.approx([1.0])


def test_an_edited_graph_keeps_the_own_anatomy(desk: Desk) -> None:
    """A desk for another graph with the same places keeps the bundles, and its usual desk follows the graph."""
    other = desk_with(desk, desk.graph)
    assert other.template is desk.template
    assert other.usual is not None
    assert other.usual.template is desk.usual.template
    assert other.layers == desk.layers


def test_case_yaml_keeps_the_block(case: Case, tmp_path: Path) -> None:
    """Written and read again, the block is the same."""
    write_case(tmp_path / "case.yaml", case.spec, None)
    assert read_case(tmp_path / "case.yaml")[0].anatomy == case.spec.anatomy


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("name: P-07", "name: template", "does not say whose anatomy"),
        ("kind: bundles", "kind: tracts", r"case\.yaml:\d+ anatomy\.0\.kind"),
        ("kind: bundles", "kind: labels", "only bundles are led to template space"),
        ("affine: to_template.txt", "displacement: w.nii.gz", "goes with `axes`"),
        ("affine: to_template.txt", "affine: a.txt, displacement: w.nii.gz, axes: ras", "either `affine` or"),
    ],
)
def test_a_block_that_makes_no_sense_is_refused(
    case: Case, tmp_path: Path, old: str, new: str, said: str
) -> None:  # fmt: skip
    """The fault names case.yaml, its line and what would do."""
    with pytest.raises(BywayError, match=said):
        changed(case, tmp_path, old, new)


@pytest.mark.parametrize(
    ("table", "said"),
    [
        (f"element,file\n{LONG},../out.trk\n", "a file inside the case folder"),
        ("element,file\nnowhere@left,long.trk\n", r"mapping\.csv:2: nowhere@left"),
        (f"element,file\n{LONG},gone.trk\n", r"file 'gone\.trk' is not there"),
        (f"element,file\n{LONG},map.nii.gz\n", r"map\.nii\.gz with kind bundles; expected streamlines"),
        ("file\nlong.trk\n", "no column 'element'"),
    ],
)
def test_a_table_that_cannot_be_used_is_refused(template: Template, tmp_path: Path, table: str, said: str) -> None:
    """The fault names the table, the line and what would do."""
    case = own_case(tmp_path / "case", template)
    (tmp_path / "case" / "out.trk").write_bytes(b"")
    (tmp_path / "out.trk").write_bytes(b"")
    (case.folder / "anatomy" / "map.nii.gz").write_bytes(b"")
    text = table.replace("../out.trk", "../../out.trk")
    (case.folder / "anatomy" / "mapping.csv").write_text(text)
    with pytest.raises(BywayError, match=said):
        desk_of(case, progress=False)


def test_two_anatomies_of_one_case(template: Template, tmp_path: Path) -> None:
    """A department's map of a region and the person's bundles lie on one template; one element in both is refused."""
    case = own_case(tmp_path / "case", template)
    site = case.folder / "site"
    site.mkdir()
    labels = np.zeros(TEMPLATE_GRID.shape, np.int16)
    labels[90:95, 140:146, 130:134] = 12
    nib.save(nib.Nifti1Image(labels, TEMPLATE_GRID.affine), site / "labels.nii.gz")
    (site / "mapping.csv").write_text("element,file,label\nsma@left,labels.nii.gz,12\n")
    text = case.path.read_text() + "- {name: site atlas, kind: labels, folder: site}\n"
    case.path.write_text(text)
    both = desk_of(open_case(case.folder), progress=False)
    assert set(both.template.geometry.anatomy) == {"template", "P-07", "site atlas"}
    assert both.template.parcel("sma", "left").sum() == 5 * 6 * 4
    again = "P-08, kind: bundles, affine: to_template.txt"
    case.path.write_text(text.replace("site atlas, kind: labels, folder: site", again))
    with pytest.raises(BywayError, match="which P-07 has already"):
        desk_of(open_case(case.folder), progress=False)
    assert set(KINDS) == {"tract_maps", "labels", "bundles"}


def test_the_archive_takes_it_along_and_lists_what_its_headers_say(template: Template, tmp_path: Path) -> None:
    """A packed case explains on its own bundles elsewhere; a command in a bundle's header is listed beforehand."""
    case = own_case(tmp_path / "case", template)
    bundle = case.folder / "anatomy" / "middle.tck"
    assert not [t for t in identifying_traces(case.folder) if t.file.endswith((".trk", ".tck"))]
    pack_case(case.folder, tmp_path / "case.zip", reviewed=True)
    unpack_case(tmp_path / "case.zip", tmp_path / "there")
    assert {".trk", ".tck", ".trx"} <= set(KEPT)
    there = desk_of(open_case(tmp_path / "there"), progress=False)
    assert there.template.geometry.anatomy.count("P-07") == 2
    data = bundle.read_bytes()
    bundle.write_bytes(data.replace(b"\nEND", b"\ncommand_history: track /home/ab/Doe_Jane\nEND", 1))
    assert any("Doe_Jane" in trace.found for trace in identifying_traces(case.folder))


class TestCommands:
    """`byway damage --anatomy` and `byway anatomy compare`."""

    def test_damage_on_a_folder(
        self, case: Case, tmp_path: Path, template: Template, capsys: pytest.CaptureFixture[str]
    ) -> None:  # fmt: skip
        """The table says whose anatomy; the name is the folder's."""
        mask = tmp_path / "mask.nii.gz"
        nib.save(nib.Nifti1Image(case.lesion.mask.astype(np.uint8), TEMPLATE_GRID.affine), mask)
        folder = write_own(tmp_path / "person_7", template)
        code = main(["damage", str(mask), "--anatomy", str(folder), "--affine", str(folder / "to_template.txt"),
                     "--csv", str(tmp_path / "t.csv")])  # fmt: skip
        out = capsys.readouterr().out
        assert code == 0
        assert "Anatomy: person_7 (2 elements) and the template's" in out
        assert f"{LONG},segment" in (tmp_path / "t.csv").read_text()
        assert "person_7" in (tmp_path / "t.csv").read_text()

    @pytest.mark.parametrize(
        ("options", "said"),
        [
            (["--anatomy", "{own}"], "lie in the template's brain"),
            (["--anatomy", "{here}/nothing"], "no such folder"),
            (["--anatomy", "{here}"], r"mapping.csv or mapping.tsv"),
            (["--affine", "{own}/to_template.txt"], "without --anatomy"),
            (["--anatomy", "{own}", "--displacement", "x.nii.gz"], "without its axes"),
            (["--anatomy", "{own}", "--affine", "{own}/mapping.csv"], "four rows of four numbers"),
        ],
    )
    def test_bad_input_is_told_in_lines(
        self, options: list[str], said: str, case: Case, tmp_path: Path, template: Template,
        capsys: pytest.CaptureFixture[str],
    ) -> None:  # fmt: skip
        """Exit code 2, each fault a line, no traceback."""
        mask = tmp_path / "mask.nii.gz"
        nib.save(nib.Nifti1Image(case.lesion.mask.astype(np.uint8), TEMPLATE_GRID.affine), mask)
        own = write_own(tmp_path / "own", template)
        if "brain" in said:  # far from where the template lies
            table = np.eye(4)
            table[0, 3] = 400
            np.savetxt(own / "far.txt", table)
            options = [*options, "--affine", str(own / "far.txt")]
        given = [option.format(own=own, here=tmp_path) for option in options]
        assert main(["damage", str(mask), *given]) == 2
        err = capsys.readouterr().err
        assert said in err
        assert all(line.startswith("byway: ") for line in err.strip().splitlines())

    def test_compare(self, case: Case, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
        """Both shares and their difference; a case without own anatomy gets one line and exit code 2."""
        assert main(["anatomy", "compare", str(case.folder), "--csv", str(tmp_path / "c.csv")]) == 0
        out, err = capsys.readouterr()
        assert LONG in out
        assert "difference" in out
        assert "no diagnosis" in err
        assert (tmp_path / "c.csv").read_text().startswith("element,kind,name,side,anatomy,share")
        (tmp_path / "case.yaml").write_text("stage: acute\n")
        assert main(["anatomy", "compare", str(tmp_path)]) == 2
        assert "no anatomy of its own" in capsys.readouterr().err


def test_a_layer_from_any_folder_is_called_after_it(template: Template, tmp_path: Path) -> None:
    """Its name, unless another is given."""
    folder = write_own(tmp_path / "site_b", template, native=False)
    assert folder_layer(folder).name == "site_b"
    assert folder_layer(folder, name="Site B").name == "Site B"
