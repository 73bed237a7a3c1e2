"""A real browser for the front-end tests; they skip, saying why, where there is none."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any
from urllib.parse import urlsplit

import pytest
from browser.notebook_page import CHROMIUM_FLAGS
from browser.notebook_server import NotebookServer

ARTEFACTS = Path(__file__).resolve().parents[1] / "artefacts"
LOOPBACK = {"127.0.0.1", "localhost", "::1"}


@pytest.fixture(scope="session")
def artefacts() -> Path:
    """Folder for screenshots; git ignores it."""
    ARTEFACTS.mkdir(exist_ok=True)
    return ARTEFACTS


@pytest.fixture(scope="session")
def chromium() -> Iterator[Any]:
    """Headless Chromium of the machine (never a downloaded one)."""
    path = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
    if path is None:
        pytest.skip("no Chromium on this machine: install the distribution's chromium to run the browser tests")
    api = pytest.importorskip("playwright.sync_api", reason="playwright is not installed: pip install -e '.[test]'")
    with api.sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=path, args=CHROMIUM_FLAGS)
        yield browser
        browser.close()


@pytest.fixture
def page(chromium: Any) -> Iterator[Any]:
    """A fresh page, 1500 x 1000; ``page.strays`` lists every request that left loopback."""
    context = chromium.new_context(viewport={"width": 1500, "height": 1000})
    page = context.new_page()
    page.strays = []
    page.on("request", lambda r: page.strays.append(r.url)
            if urlsplit(r.url).scheme.startswith(("http", "ws")) and urlsplit(r.url).hostname not in LOOPBACK
            else None)  # fmt: skip
    yield page
    context.close()


@pytest.fixture(scope="session")
def notebook_server(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Callable[[str], NotebookServer]]:
    """Start a server of a kind (``lab``, ``notebook``, ``voila``) once a session; its ``root`` is an empty folder."""
    running: dict[str, NotebookServer] = {}

    def start(kind: str) -> NotebookServer:
        if kind not in running:
            folder = tmp_path_factory.mktemp(kind)
            (folder / "root").mkdir()
            running[kind] = NotebookServer(kind, folder / "root", folder / "home").start()
        return running[kind]

    yield start
    for server in running.values():
        server.stop()
