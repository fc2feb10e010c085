"""``python -m spinledger_app`` opens the bench."""

from __future__ import annotations

import argparse
import multiprocessing
import sys
from collections.abc import Sequence


def main(argv: Sequence[str] | None = None) -> int:
    """Open the bench; gives the exit code.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments without the program's name; those of the process by default.
    """
    multiprocessing.freeze_support()
    arguments = _parser().parse_args(argv)
    # Qt loads only once the arguments are understood.
    from spinledger_app.application import run  # noqa: PLC0415

    return run(
        places=[place for place in (arguments.data,) if place],
        structure=arguments.structure,
        solvent=arguments.solvent,
    )


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="spinledger-bench",
        description="Opens the bench, where a spectrum and a structure are reconciled.",
    )
    parser.add_argument(
        "data", nargs="?", help="spectrum (folder, file or zip) or project file"
    )
    parser.add_argument(
        "--structure", help="claimed structure: a file, a SMILES or an InChI"
    )
    parser.add_argument("--solvent", help="solvent, where the header does not tell")
    return parser


if __name__ == "__main__":
    sys.exit(main())
