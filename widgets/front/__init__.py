"""Joins a panel's ES modules into the one module that anywidget sends to the browser.

A panel is written as small ES modules beside its Python class, and shares ``widgets/front/*.js`` with the others.
Modules import each other by relative path (``./draw.js``, ``../front/dom.js``), so that they also run unbundled in
node and in a bare page. There is no build step: :func:`load_esm` orders the modules by their imports and wraps each in
a function of its own, so that private names never meet.

The grammar is small, and anything outside it raises: ``import {a, b as c} from "./x.js"``, ``import * as x from
"./x.js"``, ``export function | async function | class | const``, and ``export default`` in the entry module. Every
statement starts its line. An exported ``const`` is a value, never a live binding.
"""

from __future__ import annotations

import posixpath
import re
from functools import cache
from importlib.resources import files

from byway.knowledge.faults import BywayError, Fault

__all__ = ["load_css", "load_esm", "module_order", "read_front"]

_IMPORT = re.compile(r"^import\s+(?:\{([^}]*)\}|\*\s+as\s+(\w+))\s+from\s+[\"'](\.[^\"']+)[\"'];?[ \t]*$", re.M)
_EXPORT = re.compile(r"^export\s+(?=(?:async\s+)?(?:function\*?|class|const)\s+(\w+))", re.M)
_DEFAULT = re.compile(r"^export\s+default\s+", re.M)
_STRAY = re.compile(r"^(?:import|export)\b.*$", re.M)


@cache
def read_front(path: str) -> str:
    """Text of a front-end file, by its path below ``widgets/`` (``"slices/view.js"``)."""
    return files("byway.widgets").joinpath(path).read_text("utf-8")


def _imports(path: str) -> list[str]:
    here = posixpath.dirname(path)
    return [posixpath.normpath(posixpath.join(here, m.group(3))) for m in _IMPORT.finditer(read_front(path))]


def module_order(entry: str) -> list[str]:
    """Paths of all modules that an entry module needs, each after those that it imports; the entry is last.

    Raises
    ------
    BywayError
        If the imports form a circle.
    """
    order: list[str] = []
    open_now: list[str] = []

    def visit(path: str) -> None:
        if path in order:
            return
        if path in open_now:
            raise BywayError(Fault("import-circle", path, " -> ".join([*open_now, path]), "imports without a circle"))
        open_now.append(path)
        for target in _imports(path):
            visit(target)
        open_now.pop()
        order.append(path)

    visit(entry)
    return order


def _variable(path: str) -> str:
    return "$" + re.sub(r"\W", "_", path.removesuffix(".js"))


def _wrapped(path: str) -> str:
    text = read_front(path)
    here = posixpath.dirname(path)

    def bind(found: re.Match[str]) -> str:
        source = _variable(posixpath.normpath(posixpath.join(here, found.group(3))))
        if found.group(2):
            return f"const {found.group(2)} = {source};"
        names = ", ".join(re.sub(r"\s+as\s+", ": ", n.strip()) for n in found.group(1).split(",") if n.strip())
        return f"const {{ {names} }} = {source};"

    exported = [m.group(1) for m in _EXPORT.finditer(text)]
    body = _EXPORT.sub("", _IMPORT.sub(bind, text))
    body, defaults = _DEFAULT.subn("const $default = ", body)
    if stray := _STRAY.search(body):
        raise BywayError(Fault("module-form", path, stray.group(0), "the forms listed in byway.widgets.front"))
    returned = ", ".join(exported + (["default: $default"] if defaults else []))
    return f"// {path}\nconst {_variable(path)} = (() => {{\n{body.rstrip()}\nreturn {{ {returned} }};\n}})();\n"


@cache
def load_esm(entry: str) -> str:
    """One ES module out of an entry module and all that it imports, for a widget's ``_esm``.

    Parameters
    ----------
    entry : str
        Path below ``widgets/``, for example ``"slices/view.js"``; it must have an ``export default``.

    Raises
    ------
    BywayError
        If the imports form a circle, a statement is outside the grammar, or the entry exports no default.
    """
    order = module_order(entry)
    if not _DEFAULT.search(read_front(entry)):
        raise BywayError(Fault("module-form", entry, "no default export", "export default { render }"))
    return "\n".join([*(_wrapped(path) for path in order), f"export default {_variable(entry)}.default;\n"])


@cache
def load_css(*paths: str) -> str:
    """Style sheets below ``widgets/``, joined in the order given, for a widget's ``_css``."""
    return "\n".join(f"/* {path} */\n{read_front(path)}" for path in paths)
