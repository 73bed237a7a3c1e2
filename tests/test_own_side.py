"""A case whose weakness lies on the lesion's own side raises an alarm wherever the case is told."""

from __future__ import annotations

from pathlib import Path

import pytest

from byway.knowledge.__main__ import main

CASE = """stage: acute
cause: infarct
person: {handedness: right}
lesion:
  compartments:
  - name: core
    kind: core
    effect: 1.0
    shapes: [{shape: ellipsoid, centre_mm: [-26, -12, 12], radii_mm: [7, 9, 8]}]
findings:
- {sign: arm_weakness, side: SIDE, grade: severe}
- {sign: leg_weakness, side: SIDE, grade: moderate}
"""


@pytest.mark.parametrize(("side", "alarm"), [("left", True), ("right", False)])
def test_weakness_on_the_lesions_own_side(
    side: str, alarm: bool, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Words and report ask about the side where weakness and lesion share one, and only there."""
    (tmp_path / "case.yaml").write_text(CASE.replace("SIDE", side))
    assert main(["explain", str(tmp_path), "--report", str(tmp_path / "out.html")]) == 0
    said = "on the same side as the lesion (left): check the side"
    assert (said in capsys.readouterr().out) == alarm
    assert (said in (tmp_path / "out.html").read_text()) == alarm
