"""A headless Chromium, spoken to over a pipe in its own protocol; no library is needed."""

import base64
import json
import os
import shutil
import subprocess
import tempfile
import time

NAMES = ("chromium", "chromium-browser", "google-chrome")


def find():
    """Path of a Chromium, or None."""
    return next((p for p in map(shutil.which, NAMES) if p), None)


class Page:
    """One page of a headless Chromium."""

    def __init__(self, url):
        self.profile = tempfile.TemporaryDirectory(ignore_cleanup_errors=True)
        to_read, self.to = os.pipe()
        self.back, back_write = os.pipe()
        self.child = subprocess.Popen(
            [
                find(),
                "--headless",
                "--no-sandbox",
                "--use-angle=swiftshader",
                "--enable-unsafe-swiftshader",
                "--no-first-run",
                "--disable-background-networking",
                "--window-size=1000,900",
                f"--user-data-dir={self.profile.name}",
                "--remote-debugging-pipe",
            ],
            # The protocol reads from descriptor 3 and writes to 4.
            preexec_fn=lambda: (os.dup2(to_read, 3, True), os.dup2(back_write, 4, True)),
            close_fds=False,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        os.close(to_read)
        os.close(back_write)
        self.number, self.rest, self.session = 0, b"", None
        self.requests, self.errors = [], []
        target = self.call("Target.createTarget", url="about:blank")["targetId"]
        attached = self.call("Target.attachToTarget", targetId=target, flatten=True)
        self.session = attached["sessionId"]
        for domain in ("Network", "Page", "Runtime"):
            self.call(f"{domain}.enable")
        self.call("Page.navigate", url=url)

    def call(self, method, **params):
        """Ask and wait for the answer; events on the way are kept."""
        self.number += 1
        ask = {"id": self.number, "method": method, "params": params}
        if self.session:
            ask["sessionId"] = self.session
        os.write(self.to, json.dumps(ask).encode() + b"\0")
        while True:
            answer = self._read()
            if answer.get("id") == self.number:
                assert "error" not in answer, answer
                return answer["result"]
            if answer.get("method") == "Network.requestWillBeSent":
                self.requests.append(answer["params"]["request"]["url"])
            if answer.get("method") == "Runtime.exceptionThrown":
                self.errors.append(answer["params"])

    def _read(self):
        while b"\0" not in self.rest:
            data = os.read(self.back, 1 << 20)
            assert data, "the browser has left"
            self.rest += data
        line, self.rest = self.rest.split(b"\0", 1)
        return json.loads(line)

    def value(self, script):
        """Value of a JavaScript expression."""
        answer = self.call("Runtime.evaluate", expression=script, returnByValue=True)
        assert "exceptionDetails" not in answer, answer
        return answer["result"].get("value")

    def until(self, script, seconds=30.0):
        """Wait until an expression is true."""
        end = time.monotonic() + seconds
        while not self.value(script):
            assert time.monotonic() < end, f"never: {script}"
            time.sleep(0.1)

    def pixels(self, script):
        """PNG bytes of a canvas."""
        return base64.b64decode(self.value(script).split(",", 1)[1])

    def drag(self, x, y, dx, dy):
        """Drag with the left button."""
        self.mouse("mousePressed", x, y)
        for k in range(1, 6):
            self.mouse("mouseMoved", x + dx * k / 5, y + dy * k / 5)
        self.mouse("mouseReleased", x + dx, y + dy)

    def mouse(self, kind, x, y):
        """One mouse event."""
        self.call(
            "Input.dispatchMouseEvent",
            type=kind,
            x=x,
            y=y,
            button="left",
            buttons=0 if kind == "mouseReleased" else 1,
            clickCount=1,
        )

    def close(self):
        """End the browser."""
        self.child.kill()
        self.child.wait()
        os.close(self.to)
        os.close(self.back)
        self.profile.cleanup()
