"""``spinledger process``: raw data to a phased, flat, referenced spectrum."""

from __future__ import annotations

import argparse
import json
import sys
from pathlib import Path

from spinledger.cli.inputs import solvent_of
from spinledger.errors import SpinLedgerError
from spinledger.io.read import read_acquired
from spinledger.io.write import write_csv, write_jcamp
from spinledger.processing.automatic import process, reprocess
from spinledger.report.files import write_file
from spinledger.values.evidence import ProcessingQuality
from spinledger.values.recipe import Recipe

_JCAMP_ENDINGS = (".jdx", ".dx", ".jcamp")


class RecipeFileError(SpinLedgerError, ValueError):
    """A stored recipe cannot be read."""


def run(arguments: argparse.Namespace) -> int:
    """Run the command: print the recipe, write what was asked for."""
    solvent = solvent_of(arguments.solvent)
    recipe = None if arguments.recipe is None else _read_recipe(arguments.recipe)
    acquired = read_acquired(arguments.data, prefer_processed=arguments.processed)
    facts = {"solvent": solvent, "temperature_k": arguments.temperature}
    if recipe is None:
        processed = process(acquired, **facts)
    else:
        processed = reprocess(acquired, recipe, **facts)
    rows = processed.run.recipe.to_json()
    for path in filter(None, (arguments.out, arguments.jcamp)):
        if path.suffix.lower() in _JCAMP_ENDINGS or path == arguments.jcamp:
            write_jcamp(processed.spectrum, acquired.metadata, path)
        else:
            write_csv(processed.spectrum, path)
    if arguments.save_recipe is not None:
        text = json.dumps(rows, indent=1, ensure_ascii=False) + "\n"
        write_file(arguments.save_recipe, text.encode("utf-8"))
    for row in rows:
        details = ", ".join(
            f"{key} {_words(value)}" for key, value in row.items() if key != "step"
        )
        sys.stdout.write(f"{row['step']}: {details}\n")
    sys.stdout.write(f"quality: {_quality_words(processed.quality)}\n")
    for doubt in processed.quality.doubts:
        sys.stdout.write(f"doubt: {doubt}\n")
    return 0


def _read_recipe(path: Path) -> Recipe:
    try:
        rows = json.loads(path.read_text(encoding="utf-8"))
        return Recipe.from_json(rows)
    except OSError as error:
        reason = error.strerror or "it cannot be read"
        raise RecipeFileError(
            f"{path}: the recipe could not be read ({reason})"
        ) from error
    except (ValueError, TypeError, AttributeError) as error:
        raise RecipeFileError(
            f"{path}: this is not a stored recipe ({error})"
        ) from error


def _quality_words(quality: ProcessingQuality) -> str:
    flatness = f"baseline {quality.baseline_sd:.2f} noise sd (1 is flat)"
    if quality.phase_sd_deg is None:
        return f"phase not estimated, {flatness}"
    return f"phase good to {quality.phase_sd_deg:.1f} degrees, {flatness}"


def _words(value: object) -> str:
    if isinstance(value, float):
        return f"{value:.6g}"
    if isinstance(value, list | tuple):
        return f"{len(value)} stretches"
    return str(value)
