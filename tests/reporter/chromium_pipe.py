"""A headless Chromium driven over its debugging pipe: no port, no driver, no library beyond Python's own."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
from pathlib import Path
from typing import Any

PROGRAMS = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable")


def program() -> str | None:
    """Path of a Chromium of the system, or None."""
    return next((path for name in PROGRAMS if (path := shutil.which(name))), None)


class Chromium:
    """One browser with one page; every event since the page was opened is kept."""

    def __init__(self, profile: Path) -> None:
        to_browser, self._write = os.pipe()
        self._read, from_browser = os.pipe()

        def descriptors() -> None:  # the browser reads commands from 3 and writes answers to 4
            os.dup2(to_browser, 13)
            os.dup2(from_browser, 14)
            os.dup2(13, 3)
            os.dup2(14, 4)

        self.process = subprocess.Popen(
            [str(program()), "--headless", "--no-sandbox", "--disable-gpu", "--remote-debugging-pipe",
             "--disable-background-networking", "--no-first-run", f"--user-data-dir={profile}", "about:blank"],
            preexec_fn=descriptors, close_fds=False, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
        )  # fmt: skip
        os.close(to_browser)
        os.close(from_browser)
        self.buffer = b""
        self.count = 0
        self.events: list[dict[str, Any]] = []
        target = self.call("Target.createTarget", {"url": "about:blank"}, session=None)["targetId"]
        self.session = self.call("Target.attachToTarget", {"targetId": target, "flatten": True}, session=None)[
            "sessionId"
        ]
        for domain in ("Page", "Runtime", "Network", "Log"):
            self.call(f"{domain}.enable")

    def _message(self) -> dict[str, Any]:
        while b"\0" not in self.buffer:
            block = os.read(self._read, 1 << 16)
            if not block:
                raise RuntimeError("the browser went away")
            self.buffer += block
        line, _, self.buffer = self.buffer.partition(b"\0")
        found: dict[str, Any] = json.loads(line)
        return found

    def call(self, method: str, params: dict[str, Any] | None = None, session: str | None = "page") -> dict[str, Any]:
        """Send one command and wait for its answer."""
        self.count += 1
        command: dict[str, Any] = {"id": self.count, "method": method, "params": params or {}}
        if session:
            command["sessionId"] = self.session
        os.write(self._write, json.dumps(command).encode() + b"\0")
        while True:
            message = self._message()
            if message.get("id") == self.count:
                if "error" in message:
                    raise RuntimeError(f"{method}: {message['error']}")
                result: dict[str, Any] = message["result"]
                return result
            self.events.append(message)

    def open(self, path: Path, width: int = 1280, height: int = 900) -> None:
        """Open a file at a window size, and wait until it is loaded."""
        self.call(
            "Emulation.setDeviceMetricsOverride",
            {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": False},
        )
        self.events.clear()
        self.call("Page.navigate", {"url": path.resolve().as_uri()})
        while not any(e.get("method") == "Page.loadEventFired" for e in self.events):
            self.events.append(self._message())

    def value(self, expression: str) -> Any:
        """Value of a script expression in the page."""
        answer = self.call("Runtime.evaluate", {"expression": expression, "returnByValue": True, "awaitPromise": True})
        if "exceptionDetails" in answer:
            raise RuntimeError(str(answer["exceptionDetails"]))
        return answer["result"].get("value")

    def press(self, key: str, code: int) -> None:
        """Press and release one key."""
        text = {"text": "\r"} if key == "Enter" else {}
        for kind in ("keyDown", "keyUp"):
            self.call(
                "Input.dispatchKeyEvent",
                {"type": kind, "key": key, "code": key, "windowsVirtualKeyCode": code,
                 **(text if kind == "keyDown" else {})},
            )  # fmt: skip

    def of(self, method: str) -> list[dict[str, Any]]:
        """Parameters of every event of one kind since the page was opened."""
        return [e["params"] for e in self.events if e.get("method") == method]

    def close(self) -> None:
        self.process.terminate()
        self.process.wait(timeout=20)
        os.close(self._write)
        os.close(self._read)
