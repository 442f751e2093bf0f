"""A headless Chromium, driven over its DevTools protocol through a pair of pipes."""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import tempfile
from itertools import count
from typing import TYPE_CHECKING, Any, Final, Self

if TYPE_CHECKING:
    from collections.abc import Mapping
    from pathlib import Path

CHROMIUM: Final = shutil.which("chromium") or shutil.which("chromium-browser")

#: The shell puts the pipes where the browser looks for them, at descriptors 3 and 4.
_START: Final = 'exec 3<&"$1" 4>&"$2"; shift 2; exec "$@"'


class Browser:
    """One window; what it logs and throws is collected in ``complaints``."""

    def __init__(self) -> None:
        assert CHROMIUM is not None
        self._profile = tempfile.TemporaryDirectory(ignore_cleanup_errors=True)
        their_in, self._out = os.pipe()
        self._in, their_out = os.pipe()
        options = ["--headless", "--no-sandbox", "--disable-gpu", "--hide-scrollbars"]
        options += ["--remote-debugging-pipe", f"--user-data-dir={self._profile.name}"]
        command = ["bash", "-c", _START, "bash", str(their_in), str(their_out), CHROMIUM]
        self._process = subprocess.Popen(
            [*command, *options, "about:blank"],
            pass_fds=(their_in, their_out),
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        os.close(their_in)
        os.close(their_out)
        self._numbers = count(1)
        self._rest = b""
        self._events: list[dict[str, Any]] = []
        self._session: dict[str, str] = {}
        target = self.call("Target.createTarget", url="about:blank")["targetId"]
        attached = self.call("Target.attachToTarget", targetId=target, flatten=True)
        self._session = {"sessionId": attached["sessionId"]}
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.call(f"{domain}.enable")

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        os.close(self._out)
        os.close(self._in)
        self._process.terminate()
        self._process.wait(timeout=20)
        self._profile.cleanup()

    def call(self, method: str, **parameters: object) -> dict[str, Any]:
        """Call a method of the protocol and return its result."""
        number = next(self._numbers)
        message = {"id": number, "method": method, "params": parameters, **self._session}
        os.write(self._out, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._message()
            if answer.get("id") == number:
                assert "error" not in answer, answer
                result: dict[str, Any] = answer["result"]
                return result
            self._events.append(answer)

    def _message(self) -> dict[str, Any]:
        while b"\0" not in self._rest:
            part = os.read(self._in, 1 << 16)
            assert part, "the browser is gone"
            self._rest += part
        first, self._rest = self._rest.split(b"\0", 1)
        message: dict[str, Any] = json.loads(first)
        return message

    def open(self, path: Path, width: int, media: str = "screen", scheme: str = "light") -> None:
        """Open a file at a width, for the screen or for print, light or dark."""
        features = [{"name": "prefers-color-scheme", "value": scheme}]
        self.call("Emulation.setEmulatedMedia", media=media, features=features)
        size: Mapping[str, object] = {"width": width, "height": 900}
        self.call("Emulation.setDeviceMetricsOverride", deviceScaleFactor=1, mobile=False, **size)
        self._events.clear()
        self.call("Page.navigate", url=path.as_uri())
        while not any(event.get("method") == "Page.loadEventFired" for event in self._events):
            self._events.append(self._message())

    @property
    def complaints(self) -> list[str]:
        """Errors and log entries since the page was opened, and what it asked the network for."""
        seen = []
        for event in self._events:
            method, parameters = event.get("method"), event.get("params", {})
            if method in {"Runtime.exceptionThrown", "Runtime.consoleAPICalled", "Log.entryAdded"}:
                seen.append(json.dumps(parameters))
            if method == "Network.requestWillBeSent":
                address = parameters["request"]["url"]
                if not address.startswith(("file:", "data:")):
                    seen.append(address)
        return seen

    def run(self, script: str) -> Any:  # noqa: ANN401 -- JavaScript's values have any type
        """Return what an expression gives, waited for."""
        answer = self.call(
            "Runtime.evaluate", expression=script, returnByValue=True, awaitPromise=True
        )
        assert "exceptionDetails" not in answer, answer
        return answer["result"].get("value")
