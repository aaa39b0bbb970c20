"""Open a page in a headless browser and ask what happened there.

The browser is Chromium where the machine has one; tests that need it are skipped where
there is none.  It is driven by its own debugging protocol over a local socket.
"""

from __future__ import annotations

import base64
import json
import shutil
import subprocess
import time
from typing import TYPE_CHECKING, Any, Self

import pytest
import websocket

if TYPE_CHECKING:
    from pathlib import Path

FOUND = next(
    (
        path
        for name in ("chromium", "chromium-browser", "google-chrome", "chrome")
        if (path := shutil.which(name))
    ),
    None,
)
needs_browser = pytest.mark.skipif(
    FOUND is None, reason="no Chromium on this machine: reports are not opened"
)
FLAGS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--hide-scrollbars",
    "--remote-debugging-port=0",
    "--remote-allow-origins=*",
)
SECONDS = 60.0


class Browser:
    """One browser with one page; every event is kept."""

    def __init__(self, folder: Path) -> None:
        assert FOUND is not None
        self.process = subprocess.Popen(
            [FOUND, *FLAGS, f"--user-data-dir={folder}", "about:blank"],
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        try:
            port, path = self._port(folder / "DevToolsActivePort")
            address = f"ws://127.0.0.1:{port}{path}"
            self.socket = websocket.create_connection(
                address, timeout=SECONDS, http_no_proxy=["127.0.0.1"]
            )
        except BaseException:
            self.close()
            raise
        self.number = 0
        self.events: list[dict[str, Any]] = []
        self.session = ""
        targets = self.ask("Target.getTargets")["targetInfos"]
        page = next(t["targetId"] for t in targets if t["type"] == "page")
        found = self.ask("Target.attachToTarget", targetId=page, flatten=True)
        self.session = found["sessionId"]
        for room in ("Page", "Runtime", "Network", "Log"):
            self.ask(f"{room}.enable")

    def _port(self, file: Path) -> list[str]:
        end = time.monotonic() + SECONDS
        while time.monotonic() < end:
            if file.exists() and len(lines := file.read_text().split()) == 2:
                return lines
            if self.process.poll() is not None:
                break
            time.sleep(0.05)
        raise RuntimeError("the browser did not start")

    def ask(self, method: str, **params: Any) -> dict[str, Any]:
        """Send a command and return its answer; events that come first are kept."""
        self.number += 1
        message = {"id": self.number, "method": method, "params": params}
        if self.session:
            message["sessionId"] = self.session
        self.socket.send(json.dumps(message))
        while True:
            answer = json.loads(self.socket.recv())
            if answer.get("id") == self.number:
                assert "error" not in answer, answer
                return dict(answer["result"])
            self.events.append(answer)

    def open(self, file: Path, width: int, height: int = 900, **media: str) -> float:
        """Open a file at a width; return the seconds until it is loaded and drawn."""
        self.ask(
            "Emulation.setDeviceMetricsOverride",
            width=width,
            height=height,
            deviceScaleFactor=1,
            mobile=False,
        )
        self.ask(
            "Emulation.setEmulatedMedia",
            media=media.get("media", ""),
            features=[
                {"name": "prefers-color-scheme", "value": media.get("scheme", "light")}
            ],
        )
        self.events.clear()
        begun = time.monotonic()
        self.ask("Page.navigate", url=file.as_uri())
        while not self.named("Page.loadEventFired"):
            self.events.append(json.loads(self.socket.recv()))
        # Two frames later, everything has been laid out and painted once.
        self.value(
            "new Promise(done => requestAnimationFrame(() => "
            "requestAnimationFrame(() => done(document.body.offsetHeight))))"
        )
        return time.monotonic() - begun

    def named(self, method: str) -> list[dict[str, Any]]:
        """Return the events of a name since the page was opened."""
        return [e["params"] for e in self.events if e.get("method") == method]

    def value(self, expression: str) -> Any:
        """Return what an expression is worth in the page."""
        answer = self.ask(
            "Runtime.evaluate",
            expression=expression,
            returnByValue=True,
            awaitPromise=True,
        )
        assert "exceptionDetails" not in answer, answer
        return answer["result"].get("value")

    def complaints(self) -> list[str]:
        """Return console errors, exceptions and log entries since the page opened."""
        self.value("0")
        found = [str(e) for e in self.named("Runtime.exceptionThrown")]
        found += [
            str(e) for e in self.named("Runtime.consoleAPICalled") if e["type"] != "log"
        ]
        return found + [str(e) for e in self.named("Log.entryAdded")]

    def requests(self) -> list[str]:
        """Return the addresses that were asked for, but the page's own."""
        asked = [e["request"]["url"] for e in self.named("Network.requestWillBeSent")]
        return [a for a in asked[1:] if not a.startswith("data:")]

    def pdf(self) -> bytes:
        """Return the page as it prints on A4."""
        answer = self.ask(
            "Page.printToPDF", preferCSSPageSize=True, printBackground=True
        )
        return base64.b64decode(answer["data"])

    def close(self) -> None:
        """End the browser."""
        self.process.terminate()
        try:
            self.process.wait(10)
        except subprocess.TimeoutExpired:
            self.process.kill()
            self.process.wait()

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self.socket.close()
        self.close()
