"""Progress on standard error, for anything that takes over a second."""

from __future__ import annotations

import sys
import time
from typing import TextIO

_QUIET_S = 1.0
_INTERVAL_S = 0.5
_WIDTH = 78


class ProgressLine:
    """One line that is written over on a terminal; elsewhere a line a stage.

    Use it as a context manager; on leaving, a terminal's line is wiped.

    Parameters
    ----------
    stream : TextIO, optional
        Standard error by default.
    """

    def __init__(self, stream: TextIO | None = None) -> None:
        self._stream = stream if stream is not None else sys.stderr
        self._start = time.monotonic()
        self._last = self._start
        self._stage = ""
        self._is_shown = False

    def __enter__(self) -> ProgressLine:
        return self

    def __exit__(self, *_: object) -> None:
        if self._is_shown and self._stream.isatty():
            self._stream.write("\r" + " " * _WIDTH + "\r")
            self._stream.flush()

    def __call__(self, stage: str, fraction: float) -> None:
        """Show a stage, once a second has passed.

        Parameters
        ----------
        stage : str
            In words.
        fraction : float
            0 to 1.
        """
        now = time.monotonic()
        if now - self._start < _QUIET_S:
            return
        is_terminal = self._stream.isatty()
        if is_terminal and now - self._last < _INTERVAL_S and stage == self._stage:
            return
        if not is_terminal and (stage == self._stage or now - self._last < _QUIET_S):
            return
        self._stage, self._last, self._is_shown = stage, now, True
        words = f"{100 * min(max(fraction, 0.0), 1.0):3.0f} %  {stage}"[:_WIDTH]
        self._stream.write(f"\r{words:<{_WIDTH}}" if is_terminal else f"{words}\n")
        self._stream.flush()
