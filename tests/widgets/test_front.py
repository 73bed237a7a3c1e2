"""Joining ES modules into one."""

from __future__ import annotations

import shutil
import subprocess
from pathlib import Path

import pytest

from byway.knowledge.faults import BywayError
from byway.widgets import front


@pytest.fixture
def shelf(monkeypatch: pytest.MonkeyPatch) -> dict[str, str]:
    """Front-end files by path, in place of those of the package."""
    shelf: dict[str, str] = {}
    monkeypatch.setattr(front, "read_front", shelf.__getitem__)
    front.load_esm.cache_clear()
    return shelf


def test_private_names_do_not_meet(shelf: dict[str, str], tmp_path: Path) -> None:
    """Two modules with a private ``hidden`` each keep their own; renamed, whole and default forms all resolve."""
    node = shutil.which("node")
    if node is None:
        pytest.skip("node is not installed")
    shelf["a/one.js"] = "const hidden = 1;\nexport function one() { return hidden; }\nexport const two = 2;\n"
    shelf["b/view.js"] = (
        'import { one as uno, two } from "../a/one.js";\nimport * as all from "../a/one.js";\n'
        "const hidden = 10;\nexport default { value: uno() + two + all.one() + hidden };\n"
    )
    bundle = tmp_path / "bundle.mjs"
    bundle.write_text(front.load_esm("b/view.js") + "")
    script = f'import("{bundle.as_uri()}").then((m) => console.log(m.default.value))'
    out = subprocess.run([node, "-e", script], capture_output=True, text=True, check=True)
    assert out.stdout.strip() == "14"


def test_each_module_stands_once_after_what_it_imports(shelf: dict[str, str]) -> None:
    """A module that two others import is listed once, before both."""
    shelf["x.js"] = "export const x = 1;"
    shelf["y.js"] = 'import { x } from "./x.js";\nexport const y = x;'
    shelf["z.js"] = 'import { y } from "./y.js";\nimport { x } from "./x.js";\nexport default { x, y };'
    assert front.module_order("z.js") == ["x.js", "y.js", "z.js"]


def test_a_circle_is_named(shelf: dict[str, str]) -> None:
    """Two modules that import each other raise, with the path of the circle."""
    shelf["x.js"] = 'import { y } from "./y.js";\nexport const x = 1;'
    shelf["y.js"] = 'import { x } from "./x.js";\nexport const y = 1;'
    with pytest.raises(BywayError, match=r"x\.js -> y\.js -> x\.js"):
        front.module_order("x.js")


@pytest.mark.parametrize("line", ["export let x = 1;", 'import d from "./d.js";', "export { x };"])
def test_forms_outside_the_grammar_raise(shelf: dict[str, str], line: str) -> None:
    """A form that the joiner does not know is refused, not passed to the browser."""
    shelf["bad.js"] = f"{line}\nexport default {{}};"
    with pytest.raises(BywayError, match=r"bad\.js"):
        front.load_esm("bad.js")
