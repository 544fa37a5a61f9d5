"""A real pseudo-terminal with an emulator in it, for running the installed program.

Nothing here sleeps: every wait is for something on the emulated screen, with a deadline.
"""

from __future__ import annotations

import contextlib
import fcntl
import os
import pty
import re
import select
import signal
import struct
import subprocess
import sys
import termios
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pyarrow as pa
import pyarrow.parquet as pq
import pyte
import pytest

DEADLINE = 60.0  # seconds; generous because compiling loops for the first time is slow
KEYS = {
    "enter": "\r",
    "escape": "\x1b",
    "tab": "\t",
    "up": "\x1b[A",
    "down": "\x1b[B",
    "right": "\x1b[C",
    "left": "\x1b[D",
    "backspace": "\x7f",
    "end": "\x1b[F",
    "ctrl+c": "\x03",
}


class Terminal:
    """One program on a pseudo-terminal of a given size."""

    def __init__(
        self,
        argv: list[str],
        size: tuple[int, int],
        env: dict[str, str],
        cwd: Path | None = None,
    ) -> None:
        self.width, self.height = size
        self.screen = pyte.Screen(self.width, self.height)
        self._stream = pyte.ByteStream(self.screen)
        self.raw = bytearray()
        self.began = time.monotonic()
        self._master, self._slave = pty.openpty()
        self.resize(*size, tell=False)
        self.process = subprocess.Popen(
            argv,
            stdin=self._slave,
            stdout=self._slave,
            stderr=self._slave,
            env=env,
            cwd=cwd,
            start_new_session=True,
            close_fds=True,
            preexec_fn=self._take_terminal,
        )

    @staticmethod
    def _take_terminal() -> None:
        fcntl.ioctl(0, termios.TIOCSCTTY, 0)

    # ---- the screen ------------------------------------------------------------------------

    @property
    def lines(self) -> list[str]:
        """The rows of the screen without the spaces at their ends."""
        return [line.rstrip() for line in self.screen.display]

    @property
    def text(self) -> str:
        """The whole screen."""
        return "\n".join(self.lines)

    def line_with(self, text: str) -> str:
        """The first row that holds ``text``."""
        return next(line for line in self.lines if text in line)

    def pump(self, seconds: float) -> bool:
        """Take in what the program writes, waiting at most that long; False at its end."""
        ready, _, _ = select.select([self._master], [], [], max(seconds, 0.0))
        if not ready:
            return self.process.poll() is None
        try:
            data = os.read(self._master, 65536)
        except OSError:
            return False
        self.raw += data
        self._stream.feed(data)
        return True

    def until(self, condition: Callable[[], object], what: str, deadline: float = DEADLINE) -> None:
        """Wait until a condition holds on a whole frame, not on half of one."""
        end = time.monotonic() + deadline
        while not (condition() and self._whole() and condition()):
            if time.monotonic() > end:
                raise AssertionError(f"waited for {what}; the screen shows\n{self.text}")
            if not self.pump(0.05) and not condition():
                raise AssertionError(f"ended while waiting for {what}:\n{self.text}")

    def _whole(self) -> bool:
        """Take in the rest of a frame under way: a frame reaches the reader in several pieces."""
        pieces = 0
        while select.select([self._master], [], [], 0.03)[0] and pieces < 50 and self.pump(0.0):
            pieces += 1
        return True

    def shows(self, *texts: str, deadline: float = DEADLINE) -> None:
        """Wait until every text is on the screen."""
        self.until(lambda: all(text in self.text for text in texts), repr(texts), deadline)

    def lacks(self, text: str) -> None:
        """Wait until a text has gone from the screen."""
        self.until(lambda: text not in self.text, f"{text!r} to go")

    def settle(self, quiet: float = 0.3) -> None:
        """Take in output until nothing has come for a moment; for counting bytes only."""
        size = -1
        while size != len(self.raw):
            size = len(self.raw)
            self.pump(quiet)

    # ---- the keyboard ------------------------------------------------------------------------

    def press(self, *keys: str) -> None:
        """Send keys: names from KEYS, or text as it is."""
        for key in keys:
            os.write(self._master, KEYS.get(key, key).encode())

    def paste(self, text: str) -> None:
        """Paste a text of any length, marked as pasted, reading what comes meanwhile."""
        data = b"\x1b[200~" + text.encode() + b"\x1b[201~"
        end = time.monotonic() + DEADLINE
        os.set_blocking(self._master, False)  # a full queue must not keep us from reading
        try:
            while data:
                assert time.monotonic() < end, f"{len(data):,} bytes are not taken"
                _, ready, _ = select.select([], [self._master], [], 0.05)
                with contextlib.suppress(BlockingIOError):
                    data = data[os.write(self._master, data[:4096]) if ready else 0 :]
                self.pump(0.0)
        finally:
            os.set_blocking(self._master, True)

    def resize(self, width: int, height: int, tell: bool = True) -> None:
        """Give the terminal another size."""
        fcntl.ioctl(self._slave, termios.TIOCSWINSZ, struct.pack("HHHH", height, width, 0, 0))
        if tell:
            self.width, self.height = width, height
            self.screen.resize(height, width)
            os.kill(self.process.pid, signal.SIGWINCH)

    # ---- the end -----------------------------------------------------------------------------

    def ends(self, deadline: float = DEADLINE) -> int:
        """Wait for the program to end; its exit status."""
        end = time.monotonic() + deadline
        while self.process.poll() is None:
            assert time.monotonic() < end, f"did not end; the screen shows\n{self.text}"
            self.pump(0.05)
        while self.pump(0.0) and select.select([self._master], [], [], 0.05)[0]:
            pass
        return self.process.returncode

    def left_clean(self) -> dict[str, bool]:
        """What the program must have put back."""
        flags = termios.tcgetattr(self._slave)[3]
        raw = bytes(self.raw)
        return {
            "echo": bool(flags & termios.ECHO),
            "line editing": bool(flags & termios.ICANON),
            "signals": bool(flags & termios.ISIG),
            "cursor shown": raw.rfind(b"\x1b[?25h") > raw.rfind(b"\x1b[?25l"),
            "main screen": raw.rfind(b"\x1b[?1049l") > raw.rfind(b"\x1b[?1049h"),
            "paste mode off": raw.rfind(b"\x1b[?2004l") > raw.rfind(b"\x1b[?2004h"),
            "mouse off": not re.search(rb"\x1b\[\?(1000|1003|1006)h", raw),
        }

    def hang_up(self, deadline: float = DEADLINE) -> int:
        """Drop the connection; the exit status of the program, which has nobody to talk to."""
        for end in (self._slave, self._master):
            os.close(end)
        self._master = self._slave = -1
        return self.process.wait(deadline)

    def close(self) -> None:
        """End the program if it still runs."""
        if self.process.poll() is None:
            self.process.kill()
            self.process.wait()
        if self._master >= 0:
            os.close(self._master)
            os.close(self._slave)


@pytest.fixture
def terminal(tmp_path: Path) -> Iterator[Callable[..., Terminal]]:
    """``terminal(*arguments, size=(80, 24), **environment)`` runs kingpost; ended afterwards.

    ``code`` is Python run before it in the same process: for making something go wrong.
    """
    opened: list[Terminal] = []

    def start(
        *arguments: Any,
        size: tuple[int, int] = (80, 24),
        piped: Path | None = None,
        code: str = "",
        cwd: Path | None = None,
        **environment: str,
    ) -> Terminal:
        env = {
            key: value
            for key, value in os.environ.items()
            if not key.startswith(("LC_", "TEXTUAL"))
            # Some runners of tests set the size of a terminal that is not this one.
            and key not in ("LANG", "NO_COLOR", "COLORTERM", "COLUMNS", "LINES")
        }
        env |= {
            "TERM": "xterm-256color",
            "LANG": "C.UTF-8",
            "XDG_STATE_HOME": str(tmp_path / "state"),
            "XDG_CONFIG_HOME": str(tmp_path / "config"),
            "XDG_CACHE_HOME": str(tmp_path / "cache"),
            "KINGPOST_CACHE_DIR": str(tmp_path / "cache"),
        }
        env |= environment
        how = ["-c", f"{code}\nfrom kingpost.tui.cli import main\nmain()"] if code else []
        argv = [sys.executable, *(how or ["-m", "kingpost.tui"]), *map(str, arguments)]
        if piped is not None:  # a shell's pipe: standard input is no terminal then
            argv = ["sh", "-c", 'cat "$0" | exec "$@"', str(piped), *argv]
        opened.append(Terminal(argv, size, env, cwd))
        return opened[-1]

    yield start
    for one in opened:
        one.close()


@pytest.fixture
def calls(tmp_path: Path) -> Path:
    """A small table of calls between invented services: a ring with shortcuts into its start."""
    names = [f"berth-{i:03d}" for i in range(60)]
    edges = [(i, (i + 1) % 60, 5) for i in range(60)]
    edges += [(i, 7, 40 + i) for i in range(0, 60, 2) if i != 7]
    edges += [(i, 11, 10 + i) for i in range(0, 60, 3) if i != 11]
    path = tmp_path / "ferry_calls.parquet"
    source, target, weight = zip(*edges, strict=True)
    pq.write_table(
        pa.table(
            {
                "caller": [names[i] for i in source],
                "callee": [names[i] for i in target],
                "calls_per_min": list(weight),
            }
        ),
        path,
    )
    return path
