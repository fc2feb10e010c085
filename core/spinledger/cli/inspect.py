"""``spinledger inspect``: what a place holds, and the facts of the acquisition."""

from __future__ import annotations

import argparse
import json
import sys
from dataclasses import asdict
from typing import Any

from spinledger.errors import SpectrumFormatError
from spinledger.io.experiment import Experiment
from spinledger.io.read import list_experiments, read_acquired
from spinledger.values.acquisition import Acquired, Fid

_WORDS = {
    "source_name": "source",
    "format_name": "format",
    "nucleus": "nucleus",
    "spectrometer_frequency_mhz": "field in MHz",
    "solvent": "solvent",
    "temperature_k": "temperature in K",
    "n_scans": "scans",
    "pulse_program": "pulse program",
    "pulse_length_us": "pulse in µs",
    "pulse_angle_deg": "pulse angle in degrees",
    "relaxation_delay_s": "relaxation delay in s",
    "acquired_on": "acquired on",
    "title": "title",
    "sha256": "SHA-256",
}


def run(arguments: argparse.Namespace) -> int:
    """Run the command; a place with something readable gives 0."""
    experiments = list_experiments(arguments.data)
    acquired, reason = _read(arguments)
    if not experiments and acquired is None:
        raise SpectrumFormatError(arguments.data, reason)
    if arguments.json:
        tree = {
            "experiments": [_experiment(one) for one in experiments],
            "metadata": None if acquired is None else _metadata(acquired),
            "reason": reason,
        }
        sys.stdout.write(json.dumps(tree, indent=1, ensure_ascii=False) + "\n")
        return 0
    sys.stdout.write(f"{len(experiments)} experiment(s)\n")
    for one in experiments:
        sys.stdout.write(f"  {one.name}: {one.summary} [{one.format_name}]\n")
    if acquired is None:
        sys.stdout.write(f"not taken: {reason}\n")
        return 0
    for name, value in _metadata(acquired).items():
        if name != "notes":
            sys.stdout.write(f"{_WORDS.get(name, name)}: {_value(value)}\n")
    for note in acquired.metadata.notes:
        sys.stdout.write(f"note: {note}\n")
    return 0


def _read(arguments: argparse.Namespace) -> tuple[Acquired | None, str]:
    try:
        return read_acquired(arguments.data), ""
    except SpectrumFormatError as error:
        return None, error.reason


def _experiment(one: Experiment) -> dict[str, Any]:
    return {**asdict(one), "path": str(one.path)}


def _metadata(acquired: Acquired) -> dict[str, Any]:
    facts = asdict(acquired.metadata)
    facts["notes"] = list(facts["notes"])
    if isinstance(acquired, Fid):
        facts["complex points"] = int(acquired.samples.size)
        facts["sweep in Hz"] = acquired.spectral_width_hz
        facts["acquisition time in s"] = round(acquired.acquisition_time_s, 6)
        facts["digital-filter delay in points"] = acquired.group_delay_points
    else:
        facts["points"] = acquired.spectrum.n_points
        facts["sweep in Hz"] = acquired.spectrum.spectral_width_hz
    return facts


def _value(value: object) -> str:
    if value is None:
        return "not in the file"
    return f"{value:.8g}" if isinstance(value, float) else str(value)
