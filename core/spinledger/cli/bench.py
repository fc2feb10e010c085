"""``spinledger open``: start the desktop bench as a process of its own."""

from __future__ import annotations

import argparse
import subprocess
import sys
from importlib.util import find_spec
from pathlib import Path

from spinledger.errors import SpinLedgerError

_NEEDED = ("spinledger_app", "spinledger_app.__main__", "PySide6", "pyqtgraph")


class BenchMissingError(SpinLedgerError):
    """The bench, or a library it needs, is not installed."""


def run(arguments: argparse.Namespace) -> int:
    """Run the command; it ends when the window is closed.

    Raises
    ------
    BenchMissingError
        If the bench cannot be started here.
    """
    for name in _NEEDED:
        if _is_missing(name):
            raise BenchMissingError(
                f"the bench needs {name.split('.')[0]}, which is not installed; install "
                'it with "pip install spinledger[bench]"'
            )
    command = _bench_command()
    if arguments.data is not None:
        command.append(arguments.data)
    if arguments.structure is not None:
        command += ["--structure", arguments.structure]
    return 0 if subprocess.call(command) == 0 else 1


def _bench_command() -> list[str]:
    """How the bench is started: as a module, or as the packaged program beside."""
    if getattr(sys, "frozen", False):
        own = Path(sys.executable)
        return [str(own.with_name(f"spinledger-bench{own.suffix}"))]
    return [sys.executable, "-m", "spinledger_app"]


def _is_missing(name: str) -> bool:
    try:
        return find_spec(name) is None
    except ModuleNotFoundError:  # the package above it is missing
        return True
