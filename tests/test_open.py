"""``byway open``: JupyterLab on the first notebook, on loopback, behind a token, asking the network for nothing."""

from __future__ import annotations

import os
import re
import signal
import subprocess
import sys
import time
import urllib.error
import urllib.request
from collections.abc import Iterator
from pathlib import Path

import pytest


@pytest.fixture
def address(tmp_path: Path) -> Iterator[str]:
    """Start the command with private Jupyter folders; yield the address that it prints."""
    env = {**os.environ, "IPYTHONDIR": str(tmp_path / "ipython")}
    env |= {f"JUPYTER_{part}_DIR": str(tmp_path / part.lower()) for part in ("CONFIG", "DATA", "RUNTIME")}
    log = tmp_path / "log"
    with log.open("wb") as out:
        process = subprocess.Popen([sys.executable, "-m", "byway.knowledge", "open", "--no-browser"], env=env,
                                   stdout=out, stderr=out, start_new_session=True)  # fmt: skip
        try:
            end = time.monotonic() + 180
            while not (found := re.search(r"http://127\.0\.0\.1:\d+/\S*token=\w+", log.read_text(errors="replace"))):
                assert process.poll() is None, log.read_text()[-2000:]
                assert time.monotonic() < end, log.read_text()[-2000:]
                time.sleep(0.2)
            yield found.group()
        finally:
            os.killpg(process.pid, signal.SIGKILL)
            process.wait()


def test_open_serves_the_first_case(address: str) -> None:
    """The printed address is on loopback, names the first case and answers with its token; without it, it refuses."""
    assert "/lab/tree/first_case.ipynb" in address
    opener = urllib.request.build_opener(urllib.request.ProxyHandler({}))
    base, _, token = address.partition("/lab/tree/first_case.ipynb?token=")
    with opener.open(f"{base}/api/contents/first_case.ipynb?token={token}", timeout=20) as answer:
        assert answer.status == 200
    with pytest.raises(urllib.error.HTTPError):
        opener.open(f"{base}/api/contents/first_case.ipynb", timeout=20)
