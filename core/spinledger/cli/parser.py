"""Words of the command line."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from pathlib import Path

from spinledger import __version__

_Subparsers = argparse._SubParsersAction


def build_parser() -> argparse.ArgumentParser:
    """Parser of all commands; each names the module that runs it."""
    parser = argparse.ArgumentParser(
        prog="spinledger",
        description="Reconcile an acquired proton NMR spectrum with a claimed "
        "structure, entry by entry.",
        epilog='"spinledger COMMAND --help" explains a command.',
    )
    parser.add_argument(
        "--version", action="version", version=f"spinledger {__version__}"
    )
    commands = parser.add_subparsers(
        title="commands", dest="command", metavar="COMMAND", required=True
    )
    for add in (
        _reconcile,
        _rank,
        _process,
        _inspect,
        _predict,
        _batch,
        _open,
        _compare,
        _sample,
        _mixture,
        _library,
        _report,
        _quantify,
    ):
        add(commands)
    return parser


def _command(
    commands: _Subparsers[argparse.ArgumentParser], name: str, words: str
) -> argparse.ArgumentParser:
    parser = commands.add_parser(name, help=words, description=f"{words}.")
    parser.add_argument(
        "--traceback", action="store_true", help="show where an internal fault arose"
    )
    parser.set_defaults(module=name)
    return parser


def _data(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "data", metavar="DATA", type=Path, help="data folder, file or zip of one"
    )


def _matching_options(parser: argparse.ArgumentParser) -> None:
    """Options that reconcile and rank share."""
    _spectrum_options(parser)
    parser.add_argument("--ph", type=_number(0, 14), help="pH of the sample")
    parser.add_argument(
        "--species", metavar="FILE.sdf", type=Path, help="further species of a mixture"
    )
    parser.add_argument(
        "--strays", metavar="FILE.smi", type=Path, help="what else may be in the tube"
    )
    parser.add_argument(
        "--side",
        metavar="FILE_OR_TEXT",
        help="carbon count or list, HSQC or COSY pairs, as in 'carbons: 9; HSQC: "
        "4.12/60.5, 1.26/14.2'",
    )
    parser.add_argument(
        "--contenders",
        metavar="N",
        type=_count(0),
        help="enumerated isomers to test (default: a few within the time budget)",
    )
    parser.add_argument(
        "--quick", action="store_true", help="no contenders, no advice, fewer starts"
    )


def _spectrum_options(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "--solvent", metavar="NAME", help="wins over the spectrum and its header"
    )
    parser.add_argument(
        "--temperature", metavar="K", type=_number(100, 600), help="of the sample, in K"
    )
    parser.add_argument(
        "--processed",
        action="store_true",
        help="take the maker's processed spectrum instead of the FID",
    )


def _output(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "--out", metavar="DIR", type=Path, required=True, help="folder for the results"
    )


def _formats(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "--formats",
        metavar="LIST",
        help="comma list of json, csv, html, text, svg, docx, xlsx, nmredata, jcamp, "
        "or all (default: json,csv,html,text,svg)",
    )


def _template(parser: argparse.ArgumentParser) -> None:
    """Choices of the report's form."""
    parser.add_argument(
        "--journal",
        choices=("acs", "rsc"),
        default="acs",
        help="form of the experimental sentence (default: acs)",
    )
    parser.add_argument(
        "--sections",
        metavar="LIST",
        help="comma list of the parts to print, in order; a minus in front leaves "
        "one out, as in -audit,-signatures (default: all)",
    )


def _reconcile(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "reconcile", "Reconcile a spectrum with a structure")
    _data(parser)
    parser.add_argument(
        "--structure", metavar="FILE_OR_SMILES", required=True, help="claimed structure"
    )
    _output(parser)
    _matching_options(parser)
    _formats(parser)
    _template(parser)


def _rank(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "rank", "Rank candidate structures by a spectrum")
    _data(parser)
    parser.add_argument(
        "--candidates",
        metavar="FILE.smi",
        type=Path,
        required=True,
        help='one "SMILES name" a line, or an SD file',
    )
    _output(parser)
    _matching_options(parser)


def _process(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "process", "Process raw data to a spectrum")
    _data(parser)
    parser.add_argument(
        "--out",
        metavar="FILE",
        type=Path,
        help="spectrum.csv (columns ppm,intensity), or JCAMP-DX for .jdx and .dx",
    )
    parser.add_argument(
        "--jcamp", metavar="FILE", type=Path, help="write JCAMP-DX as well"
    )
    parser.add_argument(
        "--recipe", metavar="FILE", type=Path, help="run this stored recipe (JSON)"
    )
    parser.add_argument(
        "--save-recipe", metavar="FILE", type=Path, help="store the recipe as JSON"
    )
    _spectrum_options(parser)


def _inspect(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "inspect", "Show what a place holds")
    _data(parser)
    parser.add_argument("--json", action="store_true", help="print JSON")


def _predict(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "predict", "Predict shifts and couplings")
    parser.add_argument("structure", metavar="STRUCTURE", help="SMILES or file")
    parser.add_argument("--solvent", metavar="NAME", help="default: CDCl3")
    parser.add_argument(
        "--field",
        metavar="MHZ",
        type=_number(20, 2000),
        default=400.0,
        help="proton frequency in MHz (default: 400)",
    )
    parser.add_argument("--ph", type=_number(0, 14), help="pH of the sample")
    parser.add_argument(
        "--temperature", metavar="K", type=_number(100, 600), help="in K"
    )
    parser.add_argument(
        "--svg", metavar="FILE", type=Path, help="draw the simulated spectrum"
    )
    parser.add_argument(
        "--nearest",
        action="store_true",
        help="print the known environments behind every shift",
    )
    exchange = parser.add_mutually_exclusive_group()
    exchange.add_argument(
        "--slow-exchange",
        dest="slow_exchange",
        action="store_true",
        default=None,
        help="OH and NH show their couplings",
    )
    exchange.add_argument(
        "--fast-exchange",
        dest="slow_exchange",
        action="store_false",
        help="OH and NH show no couplings",
    )
    parser.add_argument("--json", action="store_true", help="print JSON")


def _batch(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "batch", "Reconcile every row of a table")
    parser.add_argument(
        "table",
        metavar="TABLE.csv",
        type=Path,
        help="columns data, structure, solvent, id",
    )
    _output(parser)
    where = parser.add_mutually_exclusive_group()
    where.add_argument(
        "--workers",
        metavar="N",
        type=_count(1),
        default=1,
        help="processes (default 1)",
    )
    where.add_argument(
        "--cluster", metavar="ADDRESS", help="dask.distributed scheduler"
    )
    parser.add_argument(
        "--quick", action="store_true", help="no contenders, no advice, fewer starts"
    )


def _open(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "open", "Open the bench")
    parser.add_argument(
        "data", metavar="DATA", nargs="?", help="data or .sledger project to open"
    )
    parser.add_argument(
        "--structure", metavar="FILE_OR_SMILES", help="claimed structure"
    )
    parser.set_defaults(module="bench")


def _compare(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "compare", "Compare a ledger with a published list")
    parser.add_argument(
        "ledger", metavar="LEDGER", type=Path, help="ledger.json or its folder"
    )
    parser.add_argument(
        "published", metavar="PUBLISHED.txt", type=Path, help="journal text"
    )
    parser.add_argument("--json", action="store_true", help="print JSON")


def _sample(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "sample", "Reconcile several spectra of one tube")
    parser.add_argument(
        "data", metavar="DATA", nargs="+", type=Path, help="data folders or files"
    )
    parser.add_argument(
        "--structure", metavar="FILE_OR_SMILES", required=True, help="claimed structure"
    )
    _output(parser)
    _matching_options(parser)
    parser.add_argument(
        "--roles",
        metavar="LIST",
        help="comma list, one a spectrum: main, D2O shake, other solvent, other field, "
        "other temperature, reference, starting material, crude, or guess",
    )
    parser.add_argument(
        "--project",
        metavar="FILE.sledger",
        type=Path,
        help="save all spectra as one project",
    )
    limits = (
        ("--line-limit", "MOL_PERCENT", 1.0, "a new or missing line"),
        ("--integral-limit", "PERCENT", 5.0, "an integral"),
        ("--shift-limit", "PPM", 0.02, "a shift"),
    )
    for name, unit, usual, what in limits:
        parser.add_argument(
            name,
            metavar=unit,
            type=_number(1e-6, 1000),
            default=usual,
            help=f"what {what} may differ from a reference by (default: {usual:g})",
        )


def _mixture(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "mixture", "Measure the composition of a mixture")
    _data(parser)
    parser.add_argument(
        "--components",
        metavar="FILE.smi",
        type=Path,
        required=True,
        help='one "SMILES name" a line; "sm: name" for a starting material, '
        '"by-product: name" for a by-product',
    )
    _output(parser)
    _matching_options(parser)


def _library(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "library", "Keep and ask a library of own compounds")
    parser.add_argument(
        "library", metavar="FOLDER", type=Path, help="plain folder of records"
    )
    parser.add_argument(
        "--add",
        metavar="PROJECT.sledger",
        type=Path,
        help="save the reconciled compound of a project as a record",
    )
    parser.add_argument("--name", metavar="NAME", help="of the new record")
    parser.add_argument(
        "--near",
        metavar="STRUCTURE",
        help="shifts of a structure, corrected by the nearest known environments",
    )
    parser.add_argument(
        "--data",
        metavar="DATA",
        type=Path,
        help="name the records that a spectrum shows",
    )
    parser.add_argument("--solvent", metavar="NAME", help="default: CDCl3 for --near")


def _report(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(commands, "report", "Make the reports of a project again")
    parser.add_argument(
        "project", metavar="PROJECT.sledger", type=Path, help="saved project"
    )
    _output(parser)
    _formats(parser)
    _template(parser)
    parser.add_argument(
        "--published",
        metavar="FILE.txt",
        type=Path,
        help="journal text to compare with, as a table of the report",
    )


def _quantify(commands: _Subparsers[argparse.ArgumentParser]) -> None:
    parser = _command(
        commands, "quantify", "Content by internal standard, and residual solvents"
    )
    parser.add_argument(
        "data",
        metavar="DATA",
        type=Path,
        help="data folder, file or zip, or a .sledger project",
    )
    parser.add_argument(
        "--structure", metavar="FILE_OR_SMILES", help="claimed structure"
    )
    _output(parser)
    _matching_options(parser)
    _formats(parser)
    _template(parser)
    _standard_options(parser.add_argument_group("internal standard"))
    pulse = parser.add_argument_group("pulse and delay, where you know them better")
    pulse.add_argument("--pulse-angle", metavar="DEG", type=_number(1, 180))
    pulse.add_argument("--delay", metavar="S", type=_number(0, 3600))
    pulse.add_argument(
        "--t1",
        metavar="S",
        type=_number(0.001, 1000),
        help="longest measured T1 of all signals (default: 5 s is assumed)",
    )


def _standard_options(group: argparse._ArgumentGroup) -> None:
    group.add_argument("--standard-structure", metavar="FILE_OR_SMILES")
    group.add_argument("--standard-name", metavar="NAME", help="as printed")
    group.add_argument(
        "--standard-protons",
        metavar="N",
        type=_count(1),
        help="protons of its signal that is integrated",
    )
    group.add_argument(
        "--standard-at",
        metavar="PPM",
        type=_number(-20, 40),
        help="shift of that signal",
    )
    group.add_argument("--standard-mass", metavar="MG", type=_number(1e-6, 1e6))
    group.add_argument("--sample-mass", metavar="MG", type=_number(1e-6, 1e6))
    group.add_argument(
        "--balance",
        metavar="MG",
        type=_number(0, 1000),
        default=0.02,
        help="standard uncertainty of one weighing (default: 0.02)",
    )
    group.add_argument(
        "--standard-purity",
        metavar="P",
        type=_number(0.001, 1),
        default=1.0,
        help="mass fraction of its certificate (default: 1)",
    )
    group.add_argument(
        "--standard-purity-u",
        metavar="U",
        type=_number(0, 1),
        default=0.0,
        help="standard uncertainty of that (default: 0)",
    )


def _number(low: float, high: float) -> Callable[[str], float]:
    """Type of an option that is a number within limits."""

    def number(text: str) -> float:
        value = float(text)
        if not low <= value <= high:
            raise argparse.ArgumentTypeError(
                f"must be from {low:g} to {high:g}, got {text}"
            )
        return value

    return number


def _count(smallest: int) -> Callable[[str], int]:
    """Type of an option that is a whole number."""

    def count(text: str) -> int:
        value = int(text)
        if value < smallest:
            raise argparse.ArgumentTypeError(f"must be {smallest} or more, got {text}")
        return value

    return count
