"""A browser without a window, driven over a pipe in the words of its own protocol."""

from __future__ import annotations

import base64
import fcntl
import json
import os
import select
import shutil
import time
from collections.abc import Iterator
from dataclasses import replace
from importlib.resources import files
from pathlib import Path
from typing import Any

import pytest

from femag.design_file import design_from_toml
from femag.requirements import Requirements
from femag.review import Review, design_review
from femag.sheet import review_sheet

NAMES = ("chromium", "chromium-browser", "google-chrome")
PATIENCE = 60.0
"""Seconds that an answer of the browser may take."""


class Browser:
    """One page of a headless Chromium.

    Commands go to file descriptor 3 of the browser and answers come from 4, each a JSON text that
    a zero byte ends.
    """

    def __init__(self, program: str, folder: Path) -> None:
        ends = [fcntl.fcntl(end, fcntl.F_DUPFD_CLOEXEC, 10) for end in (*os.pipe(), *os.pipe())]
        to_read, self._to, self._answers, to_write = ends
        arguments = [
            "--headless=new", "--remote-debugging-pipe", "--no-sandbox", "--disable-gpu",
            "--no-first-run", "--disable-extensions", "--disable-dev-shm-usage",
            "--hide-scrollbars", f"--user-data-dir={folder}", "about:blank",
        ]  # fmt: skip
        self._process = os.posix_spawn(
            program,
            [program, *arguments],
            os.environ,
            file_actions=[
                *((os.POSIX_SPAWN_OPEN, out, os.devnull, os.O_RDWR, 0) for out in (1, 2)),
                (os.POSIX_SPAWN_DUP2, to_read, 3),
                (os.POSIX_SPAWN_DUP2, to_write, 4),
            ],
        )
        os.close(to_read)
        os.close(to_write)
        self._buffer = b""
        self._number = 0
        self._session: str | None = None
        self.events: list[dict[str, Any]] = []
        targets = self.ask("Target.getTargets")["targetInfos"]
        page = next(target["targetId"] for target in targets if target["type"] == "page")
        attached = self.ask("Target.attachToTarget", targetId=page, flatten=True)
        self._session = attached["sessionId"]
        for domain in ("Page", "Runtime", "Network", "Log"):
            self.ask(f"{domain}.enable")

    def ask(self, method: str, **parameters: Any) -> dict[str, Any]:
        """Return the browser's answer to a command; what it says meanwhile joins the events."""
        self._number += 1
        message: dict[str, Any] = {"id": self._number, "method": method, "params": parameters}
        if self._session is not None:
            message["sessionId"] = self._session
        os.write(self._to, json.dumps(message).encode() + b"\0")
        until = time.monotonic() + PATIENCE
        while time.monotonic() < until:
            answer = self._next(until)
            if answer.get("id") == self._number:
                assert "error" not in answer, answer
                result: dict[str, Any] = answer["result"]
                return result
            self.events.append(answer)
        raise TimeoutError(method)

    def _next(self, until: float) -> dict[str, Any]:
        while b"\0" not in self._buffer:
            ready, _, _ = select.select([self._answers], [], [], max(0.0, until - time.monotonic()))
            if not ready:
                raise TimeoutError
            part = os.read(self._answers, 1 << 16)
            if not part:
                raise EOFError("the browser has gone")
            self._buffer += part
        text, self._buffer = self._buffer.split(b"\0", 1)
        answer: dict[str, Any] = json.loads(text)
        return answer

    def open(self, file: Path, width: int = 1280, height: int = 900, scripts: bool = True) -> None:
        """Show a file of the disk and wait until it is drawn."""
        self.events.clear()
        self.ask("Emulation.setScriptExecutionDisabled", value=not scripts)
        self.ask("Emulation.setDeviceMetricsOverride", width=width, height=height,
                 deviceScaleFactor=1, mobile=False)  # fmt: skip
        self.ask("Page.navigate", url=file.resolve().as_uri())
        until = time.monotonic() + PATIENCE
        while not any(event.get("method") == "Page.loadEventFired" for event in self.events):
            self.events.append(self._next(until))
        if scripts:
            self.settle()

    def settle(self) -> None:
        """Wait until two frames have been drawn."""
        self.run("new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))")

    def run(self, script: str) -> Any:
        """Return the value of an expression in the page."""
        answer = self.ask(
            "Runtime.evaluate", expression=script, awaitPromise=True, returnByValue=True
        )
        assert "exceptionDetails" not in answer, answer
        return answer["result"].get("value")

    def mouse(self, kind: str, x: float, y: float, **parameters: Any) -> None:
        """Move, press or release the mouse at a place of the window."""
        self.ask("Input.dispatchMouseEvent", type=kind, x=x, y=y, **parameters)

    def click(self, x: float, y: float) -> None:
        """Click at a place of the window."""
        for kind in ("mousePressed", "mouseReleased"):
            self.mouse(kind, x, y, button="left", clickCount=1)

    def press(self, key: str) -> None:
        """Press and release a key."""
        text = {"text": key} if len(key) == 1 else {}
        self.ask("Input.dispatchKeyEvent", type="keyDown", key=key, **text)
        self.ask("Input.dispatchKeyEvent", type="keyUp", key=key)
        self.settle()

    def requests(self) -> list[str]:
        """Return what was asked for since the page was opened."""
        return [
            event["params"]["request"]["url"]
            for event in self.events
            if event.get("method") == "Network.requestWillBeSent"
        ]

    def complaints(self) -> list[dict[str, Any]]:
        """Return exceptions, errors and messages of the console since the page was opened."""
        kinds = ("Runtime.exceptionThrown", "Runtime.consoleAPICalled", "Log.entryAdded")
        return [event for event in self.events if event.get("method") in kinds]

    def printed(self) -> bytes:
        """Return the page as PDF, on the paper that it asks for."""
        answer = self.ask("Page.printToPDF", printBackground=True, preferCSSPageSize=True)
        return base64.b64decode(answer["data"])

    def picture(self, whole: bool = True) -> bytes:
        """Return the page, or what the window shows of it, as PNG."""
        answer = self.ask("Page.captureScreenshot", captureBeyondViewport=whole)
        return base64.b64decode(answer["data"])

    def close(self) -> None:
        """End the browser."""
        self._session = None
        self.ask("Browser.close")
        os.close(self._to)
        os.close(self._answers)
        os.waitpid(self._process, 0)


TITLE = "<script>alert('a & b')</script>"
LIMITS = {"inductance_least": 500e-6, "inductance_most": 600e-6, "fit": True}


@pytest.fixture(scope="session")
def reviewed() -> Review:
    """The demo under a title that looks like a tag; it misses a requirement."""
    text = files("femag").joinpath("demo.toml").read_text(encoding="utf-8")
    design = design_from_toml(text.replace("tolerance = 1e-3", "tolerance = 1e-2"))
    required = replace(design, title=TITLE, requirements=Requirements(**LIMITS))
    return design_review(required, [2.0, 6.0])


@pytest.fixture(scope="session")
def sheet(reviewed: Review, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Its sheet, as of a file whose path looks like a tag."""
    file = tmp_path_factory.mktemp("sheet") / 'it\'s a "review".html'
    file.write_text(review_sheet(reviewed, "a \"b\" <i>'c'</i>.toml"), encoding="utf-8")
    return file


@pytest.fixture(scope="session")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    """A browser; the test is left out where none is installed."""
    program = next((found for name in NAMES if (found := shutil.which(name))), None)
    if program is None:
        pytest.skip("no Chromium is installed: the page is not opened")
    running = Browser(program, tmp_path_factory.mktemp("browser"))
    yield running
    running.close()
