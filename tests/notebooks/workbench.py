"""A workbench in a folder of its own, driven in a real browser; nothing of the user's settings is read or written."""

import json
import os
import shutil
import signal
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any
from urllib.parse import urlsplit

TOKEN = "a-token-for-this-test-only"
READY = "window.jupyterapp?.shell?.currentWidget?.sessionContext?.session?.kernel?.status=='idle'"
ERRORS = '[data-mime-type="application/vnd.jupyter.error"],[data-mime-type="application/vnd.jupyter.stderr"]'
BROWSER_ARGUMENTS = (
    "--disable-gpu",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--disable-quic",
)


def find_chromium() -> str | None:
    """The browser of the machine, None where there is none."""
    return shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


def private_environment(folder: Path) -> dict[str, str]:
    """Jupyter's folders moved into `folder`."""
    names = ("CONFIG_DIR", "DATA_DIR", "RUNTIME_DIR")
    places = {f"JUPYTER_{name}": name for name in names}
    places |= {"JUPYTERLAB_SETTINGS_DIR": "settings", "JUPYTERLAB_WORKSPACES_DIR": "workspaces"}
    made = {variable: str(folder / name.lower()) for variable, name in places.items()}
    return {**os.environ, **made, "IPYTHONDIR": str(folder / "ipython")}


@contextmanager
def serve(folder: Path, cohort: Path, private: Path) -> Iterator[str]:
    """`audiokit open` on a free port; gives its address. Ends with the server's own shutdown."""
    port = _free_port()
    command = [sys.executable, "-m", "audiokit", "open", str(cohort), "--dir", str(folder), "--port", str(port)]
    command += ["--no-browser", f"--IdentityProvider.token={TOKEN}", "--LabApp.expose_app_in_browser=True"]
    command += ["--allow-root"] if getattr(os, "geteuid", lambda: 1)() == 0 else []
    log = private / "server.log"
    with log.open("w", encoding="utf-8") as told:
        server = subprocess.Popen(command, stdout=told, stderr=told, env=private_environment(private))
        try:
            _await_server(server, port, log)
            yield f"http://127.0.0.1:{port}"
        finally:
            server.send_signal(signal.SIGTERM)
            try:
                server.wait(20)
            except subprocess.TimeoutExpired:
                server.kill()


def _await_server(server: subprocess.Popen[bytes], port: int, log: Path) -> None:
    until = time.monotonic() + 60
    while time.monotonic() < until:
        if server.poll() is not None:
            raise RuntimeError(f"the server ended at once:\n{log.read_text(encoding='utf-8')}")
        try:
            address = f"http://127.0.0.1:{port}/api/status?token={TOKEN}"
            with urllib.request.urlopen(address, timeout=5) as answer:
                json.load(answer)
                return
        except (urllib.error.URLError, ConnectionError):
            time.sleep(0.2)
    raise RuntimeError(f"the server did not answer:\n{log.read_text(encoding='utf-8')}")


@dataclass
class Workbench:
    """One page with the notebook in it, and every address that it asked for."""

    page: Any
    base: str
    asked: list[str] = field(default_factory=list)
    errors: list[str] = field(default_factory=list)

    def watch(self) -> None:
        """Note every request and every error of the page from now on."""
        self.page.on("request", lambda request: self.asked.append(request.url))
        self.page.on("websocket", lambda socket: self.asked.append(socket.url))
        self.page.on("pageerror", lambda error: self.errors.append(str(error)))

    def open(self, notebook: str = "yearly_review.ipynb") -> None:
        """Open the notebook alone on the page, and wait for its kernel."""
        self.page.goto(f"{self.base}/doc/tree/{notebook}?reset&token={TOKEN}")
        self.page.wait_for_function(READY, timeout=60_000)

    def run_all(self) -> None:
        """Run every cell; comes back after the last one."""
        self.page.evaluate("jupyterapp.commands.execute('notebook:run-all-cells')")

    def strangers(self) -> list[str]:
        """Addresses outside this machine that were asked for; data and blob addresses stay inside the page."""
        inside = ("127.0.0.1", "localhost", "::1")
        return [
            url
            for url in self.asked
            if urlsplit(url).scheme not in ("data", "blob", "about") and urlsplit(url).hostname not in inside
        ]
