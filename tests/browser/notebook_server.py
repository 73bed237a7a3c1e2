"""Start and stop a Jupyter server (JupyterLab, Notebook 7 or Voila) on loopback with a token and private folders."""

from __future__ import annotations

import os
import secrets
import signal
import socket
import subprocess
import sys
import time
import urllib.request
from pathlib import Path
from types import TracebackType
from typing import IO

from browser.notebook_page import write_settings

__all__ = ["NotebookServer", "free_port"]

BIN = Path(sys.executable).parent
_EXPOSE = {"lab": "LabApp", "notebook": "JupyterNotebookApp"}


def free_port() -> int:
    """A port on loopback that nothing listens on now."""
    with socket.socket() as s:
        s.bind(("127.0.0.1", 0))
        return int(s.getsockname()[1])


class NotebookServer:
    """One server; a context manager.

    Parameters
    ----------
    kind : str
        ``lab``, ``notebook`` or ``voila``.
    root : Path
        Folder of the notebooks. Copy a notebook there first: nothing in the repository is written.
    home : Path
        Folder for settings, runtime files and the log.
    """

    def __init__(self, kind: str, root: Path, home: Path) -> None:
        self.kind, self.root, self.home = kind, root, home
        self.port, self.token = free_port(), secrets.token_hex(16)
        self.url = f"http://127.0.0.1:{self.port}"
        self.process: subprocess.Popen[bytes] | None = None
        self.log: IO[bytes] | None = None

    def __enter__(self) -> NotebookServer:
        return self.start()

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None,
                 trace: TracebackType | None) -> None:  # fmt: skip
        self.stop()

    def _command(self) -> list[str]:
        if self.kind == "voila":
            return [str(BIN / "voila"), "--no-browser", f"--port={self.port}", "--Voila.ip=127.0.0.1",
                    f"--token={self.token}", "--show_tracebacks=True", str(self.root)]  # fmt: skip
        return [str(BIN / f"jupyter-{self.kind}"), "--no-browser", "--allow-root", "--ServerApp.ip=127.0.0.1",
                f"--ServerApp.port={self.port}", "--ServerApp.port_retries=0",
                f"--IdentityProvider.token={self.token}", f"--ServerApp.root_dir={self.root}",
                "--ServerApp.open_browser=False", f"--{_EXPOSE[self.kind]}.expose_app_in_browser=True"]  # fmt: skip

    def _environment(self) -> dict[str, str]:
        env = dict(os.environ)
        for part in ("CONFIG", "DATA", "RUNTIME"):
            folder = self.home / part.lower()
            folder.mkdir(parents=True, exist_ok=True)
            env[f"JUPYTER_{part}_DIR"] = str(folder)
        env["IPYTHONDIR"] = str(self.home / "ipython")
        env["JUPYTERLAB_SETTINGS_DIR"] = str(self.home / "labsettings")
        env["JUPYTERLAB_WORKSPACES_DIR"] = str(self.home / "labworkspaces")
        env["PATH"] = f"{BIN}:{env['PATH']}"
        return env

    def start(self, timeout_s: float = 90.0) -> NotebookServer:
        """Start, and return when the server answers.

        Raises
        ------
        RuntimeError, TimeoutError
            With the end of the server's log.
        """
        self.home.mkdir(parents=True, exist_ok=True)
        write_settings(self.home)
        self.log = (self.home / "server.log").open("wb")
        self.process = subprocess.Popen(self._command(), cwd=self.root, env=self._environment(), stdout=self.log,
                                        stderr=subprocess.STDOUT, start_new_session=True)  # fmt: skip
        ready = f"{self.url}/{'' if self.kind == 'voila' else 'api/status'}?token={self.token}"
        opener = urllib.request.build_opener(urllib.request.ProxyHandler({}))  # loopback, whatever proxy is set
        end = time.monotonic() + timeout_s
        while time.monotonic() < end:
            if self.process.poll() is not None:
                raise RuntimeError((self.home / "server.log").read_text()[-3000:])
            try:
                opener.open(ready, timeout=2).read()
            except OSError:
                time.sleep(0.1)
            else:
                return self
        self.stop()
        raise TimeoutError((self.home / "server.log").read_text()[-3000:])

    def page(self, notebook: str) -> str:
        """Address of a notebook, with its token."""
        token = f"?token={self.token}"
        return {
            "lab": f"{self.url}/lab/tree/{notebook}{token}&reset",
            "notebook": f"{self.url}/notebooks/{notebook}{token}",
            "voila": f"{self.url}/voila/render/{notebook}{token}",
        }[self.kind]

    def stop(self) -> None:
        """Stop the server and the kernels that it started."""
        if self.process is not None and self.process.poll() is None:
            self.process.send_signal(signal.SIGTERM)
            try:
                self.process.wait(15)
            except subprocess.TimeoutExpired:
                os.killpg(self.process.pid, signal.SIGKILL)  # its own session: only what we started
                self.process.wait(5)
        if self.log is not None:
            self.log.close()
