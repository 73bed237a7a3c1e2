"""The direction of imports: a room imports only from the rooms to its left, and every module has a room."""

from __future__ import annotations

import ast
import graphlib
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]

# From left to right. A module may import modules of its own room and of the rooms before it.
ROOMS = (
    "byway.knowledge.faults",
    "byway.knowledge.yamltext",
    "byway.knowledge.words",
    "byway.knowledge.atomic",
    "byway.knowledge.curated",
    "byway.knowledge.graph",
    "byway.knowledge.space",
    "byway.knowledge.lesion",
    "byway.knowledge.damage",
    "byway.knowledge.reasoning",
    "byway.knowledge.cases",
    "byway.knowledge",
    "byway.knowledge.__main__",
    "byway.widgets.front",
    "byway.widgets.wire",
    "byway.widgets.numbers",
    "byway.widgets.state",
    "byway.widgets.panel",
    "byway.widgets.slices",
    "byway.widgets.hits",
    "byway.widgets.editing",
    "byway.widgets.findings",
    "byway.widgets.accounts",
    "byway.widgets.routes",
    "byway.widgets.anatomy",
    "byway.widgets.graph",
    "byway.widgets.head",
    "byway.widgets.notes",
    "byway.widgets.bench",
    "byway.widgets",
)
# The panels stand side by side: none may import another.
PANELS = tuple(f"byway.widgets.{p}" for p in
               ("slices", "hits", "findings", "editing", "accounts", "routes", "anatomy", "graph", "head",
                "notes"))  # fmt: skip


def module_name(path: Path) -> str:
    """Dotted import name of a source file."""
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(("byway", *(parts[:-1] if parts[-1] == "__init__" else parts)))


def modules() -> dict[str, Path]:
    """All modules of the project by import name."""
    files = [*ROOT.glob("knowledge/**/*.py"), *ROOT.glob("widgets/**/*.py")]
    return {module_name(path): path for path in files}


def room_of(module: str) -> int | None:
    """Index of the room that holds a module: the longest listed prefix; a package root holds only itself."""
    best = None
    for i, room in enumerate(ROOMS):
        own = module == room
        inside = module.startswith(room + ".") and room not in ("byway.knowledge", "byway.widgets")
        if (own or inside) and (best is None or len(room) > len(ROOMS[best])):
            best = i
    return best


def imports(path: Path) -> list[tuple[int, str, int]]:
    """Every import in a file, also inside functions: (line, module, relative level)."""
    found = []
    for node in ast.walk(ast.parse(path.read_text())):
        if isinstance(node, ast.Import):
            found += [(node.lineno, alias.name, 0) for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            found.append((node.lineno, node.module or "", node.level))
            found += [(node.lineno, f"{node.module}.{alias.name}", node.level) for alias in node.names if node.module]
    return found


def known(name: str, names: dict[str, Path]) -> str | None:
    """The project module that an import names, if any."""
    return name if name in names else None


def upward(names: dict[str, Path]) -> list[str]:
    """Every import that points to a room to the right."""
    faults = []
    for module, path in names.items():
        for line, target, _ in imports(path):
            if known(target, names) is None or target == module:
                continue
            here, there = room_of(module), room_of(target)
            if here is not None and there is not None and there > here:
                faults.append(f"{path.relative_to(ROOT)}:{line} {module} imports {target}, a room to its right")
    return faults


def test_every_module_has_a_room() -> None:
    """No module stands outside the list of rooms."""
    assert [name for name in modules() if room_of(name) is None] == []


def test_no_upward_import() -> None:
    """A module imports only from its own room and from rooms to its left."""
    assert upward(modules()) == []


def test_an_upward_import_is_found(tmp_path: Path) -> None:
    """The check itself can fail: a module of the graph that imports a widget inside a function is caught."""
    bad = ROOT / "knowledge" / "graph" / "records.py"
    probe = tmp_path / "probe.py"
    probe.write_text("def late():\n    from byway.widgets import bench\n    return bench\n")
    found = [target for _, target, _ in imports(probe)]
    assert "byway.widgets" in found
    assert (room_of("byway.widgets") or 0) > (room_of(module_name(bad)) or 0)


def test_no_circle() -> None:
    """The imports of the modules form no circle."""
    names = modules()
    graph: dict[str, set[str]] = {}
    for module, path in names.items():
        graph[module] = {t for _, target, _ in imports(path) if (t := known(target, names)) and t != module}
    for module in graph:  # importing a module runs its package, whose __init__ must not import back down the line
        graph[module].discard(module.rpartition(".")[0])
    graphlib.TopologicalSorter(graph).prepare()


def test_panels_do_not_know_each_other() -> None:
    """No panel imports another panel."""
    faults = []
    for module, path in modules().items():
        own = next((p for p in PANELS if module == p or module.startswith(p + ".")), None)
        if own is None:
            continue
        for line, target, _ in imports(path):
            other = next((p for p in PANELS if target == p or target.startswith(p + ".")), None)
            if other and other != own:
                faults.append(f"{path.relative_to(ROOT)}:{line} {own} imports {other}")
    assert faults == []


@pytest.mark.parametrize("bare", ["widgets", "knowledge"])
def test_no_bare_import(bare: str) -> None:
    """Nothing imports ``widgets`` or ``knowledge`` without ``byway.``: from the root it would work by accident."""
    files = [*modules().values(), *ROOT.glob("tests/**/*.py")]
    faults = [f"{path.relative_to(ROOT)}:{line}" for path in files for line, target, level in imports(path)
              if level == 0 and (target == bare or target.startswith(bare + "."))]  # fmt: skip
    assert faults == []


def test_no_relative_import() -> None:
    """Imports are absolute."""
    faults = [f"{path}:{line}" for path in modules().values() for line, _, level in imports(path) if level]
    assert faults == []


def test_every_package_is_in_the_wheel() -> None:
    """The list of packages in pyproject.toml names every folder that holds a module."""
    import tomllib

    listed = set(tomllib.loads((ROOT / "pyproject.toml").read_text())["tool"]["setuptools"]["packages"])
    there = {module_name(path / "__init__.py") for path in {p.parent for p in modules().values()}}
    assert there == listed


def test_every_data_file_is_in_the_wheel() -> None:
    """Each file beside the code (text, front end, schema) is matched by a pattern of its package's data."""
    import fnmatch
    import tomllib

    tool = tomllib.loads((ROOT / "pyproject.toml").read_text())["tool"]["setuptools"]
    folders = {package: ROOT.joinpath(*package.split(".")[1:]) for package in tool["packages"]}
    taken = {
        path
        for package, patterns in tool["package-data"].items()
        for path in folders[package].rglob("*")
        if any(
            fnmatch.fnmatch(name := path.relative_to(folders[package]).as_posix(), pattern)
            and name.count("/") == pattern.count("/")
            for pattern in patterns
        )
    }
    there = {
        path
        for top in ("knowledge", "widgets")
        for path in (ROOT / top).rglob("*")
        if path.is_file() and path.suffix not in (".py", ".pyc") and "__pycache__" not in path.parts
    }
    assert sorted(str(path.relative_to(ROOT)) for path in there - taken) == []
