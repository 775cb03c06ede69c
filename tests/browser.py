"""A headless Chromium for tests of pages, driven over its pipe by the standard library alone."""

from __future__ import annotations

import base64
import json
import os
import select
import shutil
import subprocess
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

__all__ = ["Browser", "find_browser", "started"]

_NAMES = ("chromium", "chromium-browser", "google-chrome", "chrome")
_OPTIONS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--disable-dev-shm-usage",
    "--hide-scrollbars",
    "--window-size=1100,1400",
    "--remote-debugging-pipe",
)
_PATIENCE = 60.0


def find_browser() -> str | None:
    """Path of a Chromium, if there is one."""
    return next((path for name in _NAMES if (path := shutil.which(name))), None)


class Browser:
    """One open page; events are kept in the order they come."""

    def __init__(self, to_browser: int, from_browser: int) -> None:
        self.events: list[dict[str, Any]] = []
        self._out, self._in = to_browser, from_browser
        self._rest, self._number, self._session = b"", 0, None
        target = self.call("Target.createTarget", url="about:blank")["targetId"]
        attached = self.call("Target.attachToTarget", targetId=target, flatten=True)
        self._session = attached["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.call(f"{domain}.enable")

    def call(self, method: str, **parameters: Any) -> dict[str, Any]:
        """Send one command and wait for its answer."""
        self._number += 1
        message = {"id": self._number, "method": method, "params": parameters}
        if self._session:
            message["sessionId"] = self._session
        os.write(self._out, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._next()
            if answer.get("id") == self._number:
                assert "error" not in answer, answer
                return answer["result"]
            self.events.append(answer)

    def open(self, path: Path) -> None:
        """Open a file and wait until it is loaded."""
        seen = len(self.events)
        self.call("Page.navigate", url=path.as_uri())
        while not any(e.get("method") == "Page.loadEventFired" for e in self.events[seen:]):
            self.events.append(self._next())

    def value(self, expression: str) -> Any:
        """Value of a JavaScript expression on the page."""
        answer = self.call("Runtime.evaluate", expression=expression, returnByValue=True)
        assert "exceptionDetails" not in answer, answer
        return answer["result"].get("value")

    def prefer(self, scheme: str) -> None:
        """Say that the reader prefers "light" or "dark"."""
        features = [{"name": "prefers-color-scheme", "value": scheme}]
        self.call("Emulation.setEmulatedMedia", features=features)

    def picture(self, path: Path) -> bytes:
        """Write a PNG of the whole page and return it."""
        shot = self.call("Page.captureScreenshot", captureBeyondViewport=True)
        path.write_bytes(base64.b64decode(shot["data"]))
        return path.read_bytes()

    def pdf(self) -> bytes:
        """The page printed on A4."""
        printed = self.call("Page.printToPDF", preferCSSPageSize=True, printBackground=True)
        return base64.b64decode(printed["data"])

    def complaints(self) -> list[str]:
        """Console errors and warnings, exceptions, and what the browser logged."""
        told = []
        for event in self.events:
            method, body = event.get("method"), event.get("params", {})
            if method == "Runtime.exceptionThrown":
                told.append(str(body["exceptionDetails"]))
            elif method == "Runtime.consoleAPICalled" and body["type"] in ("error", "warning"):
                told.append(str(body["args"]))
            elif method == "Log.entryAdded" and body["entry"]["level"] in ("error", "warning"):
                told.append(body["entry"]["text"])
        return told

    def requests(self) -> list[str]:
        """Addresses of everything that the page asked for."""
        wanted = "Network.requestWillBeSent"
        return [e["params"]["request"]["url"] for e in self.events if e.get("method") == wanted]

    def _next(self) -> dict[str, Any]:
        deadline = time.monotonic() + _PATIENCE
        while b"\0" not in self._rest:
            ready, _, _ = select.select([self._in], [], [], deadline - time.monotonic())
            assert ready, "the browser does not answer"
            part = os.read(self._in, 1 << 20)
            assert part, "the browser has gone"
            self._rest += part
        message, _, self._rest = self._rest.partition(b"\0")
        return json.loads(message)


@contextmanager
def started(program: str, profile: Path) -> Iterator[Browser]:
    """Start a browser with a fresh profile; end it with the block."""
    their_in, our_out = os.pipe()
    our_in, their_out = os.pipe()
    # The browser reads commands from its descriptor 3 and answers on 4.
    shell = f'exec "$@" 3<&{their_in} 4>&{their_out}'
    command = ["bash", "-c", shell, "browser", program, *_OPTIONS, f"--user-data-dir={profile}"]
    process = subprocess.Popen(
        command,
        pass_fds=(their_in, their_out),
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    os.close(their_in)
    os.close(their_out)
    try:
        yield Browser(our_out, our_in)
    finally:
        os.close(our_out)
        process.terminate()
        process.wait(timeout=_PATIENCE)
        os.close(our_in)
