"""Tasks for the tests of the working processes, which import them by name."""

from __future__ import annotations

import os
import time
from collections.abc import Callable
from pathlib import Path

from spinledger.errors import CancelledError, SpectrumFormatError

Progress = Callable[[str, float], None]
Cancelled = Callable[[], bool]


def add(progress: Progress, cancelled: Cancelled, a: int, b: int) -> int:
    for step in range(5):
        progress("adding", step / 5)
        time.sleep(0.05)
    return a + b


def wait_for_cancel(progress: Progress, cancelled: Cancelled) -> None:
    for _ in range(2000):
        if cancelled():
            raise CancelledError
        time.sleep(0.005)
    raise AssertionError("was never cancelled")


def refuse(progress: Progress, cancelled: Cancelled) -> None:
    raise SpectrumFormatError(Path("tube.dx"), "There is no spectrum in it.")


def burst(progress: Progress, cancelled: Cancelled) -> None:
    raise ZeroDivisionError("not foreseen")


def die(progress: Progress, cancelled: Cancelled) -> None:
    os._exit(9)
