"""The command line; heavy imports wait until a command needs them."""

from __future__ import annotations

import sys
import warnings
from collections.abc import Sequence
from importlib import import_module
from io import TextIOWrapper

from spinledger.cli.parser import build_parser
from spinledger.errors import SpinLedgerError, UsageError

__all__ = ["main"]


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command.

    Parameters
    ----------
    argv : sequence of str, optional
        Words after the program's name; the process's own by default.

    Returns
    -------
    int
        0: it ran; 1: something about the input is wrong, said in one line on
        standard error; 2: wrong usage.
    """
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, TextIOWrapper):
            # An old console without Greek letters shows "?" instead of failing.
            stream.reconfigure(errors="replace")
    parser = build_parser()
    try:
        arguments = parser.parse_args(argv)
    except SystemExit as stop:  # argparse has said what is wrong, or printed help
        return stop.code if isinstance(stop.code, int) else 2
    try:
        with warnings.catch_warnings():
            # Notes of the libraries to programmers, not to the user.
            warnings.simplefilter("ignore")
            command = import_module(f"spinledger.cli.{arguments.module}")
            return int(command.run(arguments))
    except UsageError as error:
        return _fail(error, 2)
    except SpinLedgerError as error:
        return _fail(error, 1)
    except KeyboardInterrupt:
        return _fail("stopped", 1)
    except BrokenPipeError:  # the reader of our output has gone
        sys.stderr.close()
        return 1
    except Exception as error:
        if arguments.traceback:
            raise
        return _fail(
            f"internal fault, {type(error).__name__}: {error} "
            "(run again with --traceback to see where)",
            1,
        )


def _fail(error: object, code: int) -> int:
    """Say what is wrong in exactly one line."""
    words = " ".join(str(error).split())
    sys.stderr.write(f"spinledger: {words}\n")
    return code
