"""Helpers that several folders of tests share live in tests/support."""

from __future__ import annotations

import hashlib
import os
import shutil
import signal
import sys
import tempfile
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent / "support"))

_SHELVES = tempfile.mkdtemp(prefix="kingpost-tests-")


def pytest_runtest_setup(item: pytest.Item) -> None:
    """Every test has a cache folder of its own, empty and far from the user's."""
    shelf = hashlib.blake2b(item.nodeid.encode(), digest_size=8).hexdigest()
    os.environ["KINGPOST_CACHE_DIR"] = os.path.join(_SHELVES, shelf)


def pytest_runtest_teardown(item: pytest.Item) -> None:
    """Nothing that was kept outlives the test."""
    shutil.rmtree(os.environ.get("KINGPOST_CACHE_DIR", _SHELVES), ignore_errors=True)


def pytest_unconfigure() -> None:
    shutil.rmtree(_SHELVES, ignore_errors=True)


if signal.getsignal(signal.SIGINT) is signal.SIG_IGN:
    # A shell starts what it runs in the background without interrupts, and every program that
    # a test interrupts would inherit that and run on for ever.
    signal.signal(signal.SIGINT, signal.default_int_handler)
