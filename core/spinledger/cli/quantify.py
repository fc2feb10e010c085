"""``spinledger quantify``: content by internal standard, residual solvents."""

from __future__ import annotations

import argparse
import datetime
import sys
from dataclasses import replace

from rdkit.Chem.Descriptors import MolWt  # type: ignore[attr-defined]  # RDKit

from spinledger.batch.job import Job, read_evidence
from spinledger.cli.inputs import options_of, solvent_of
from spinledger.cli.progress import ProgressLine
from spinledger.cli.reconcile import context_from, formats_of
from spinledger.errors import UsageError
from spinledger.project.solve import solve
from spinledger.project.storage import SUFFIX, load_project
from spinledger.quantity.conditions import PulseConditions
from spinledger.quantity.content import content
from spinledger.quantity.purity import InternalStandard, Purity, Weighings, purity
from spinledger.quantity.result import Quantity
from spinledger.reconcile.run import reconcile
from spinledger.report.files import check_writable, write_files
from spinledger.report.quantity_rows import (
    content_rows,
    quantity_json,
    quantity_sentences,
)
from spinledger.report.write import check_extras, write_reports
from spinledger.structure.read import molecule, read_structure
from spinledger.values.ledger import Ledger

_STANDARD_OPTIONS = (
    "standard_structure",
    "standard_protons",
    "standard_at",
    "standard_mass",
    "sample_mass",
)


def run(arguments: argparse.Namespace) -> int:
    """Run the command; a refusal is a result, so 0 is returned."""
    standard, weighings = _standard(arguments)
    formats = formats_of(arguments.formats)
    check_extras(formats)
    check_writable(arguments.out)
    template = context_from(arguments)
    known = PulseConditions(
        pulse_angle_deg=arguments.pulse_angle,
        delay_s=arguments.delay,
        t1_s=arguments.t1,
    )
    ledger = _ledger(arguments)
    found: Purity | None = None
    if standard is not None and weighings is not None:
        found = purity(ledger, standard, weighings, known)
    quantity = Quantity(content=content(ledger, known), purity=found)
    write_reports(
        ledger,
        arguments.out,
        formats=formats,
        context=replace(template, quantity=quantity),
    )
    write_files(arguments.out, {"quantity.json": quantity_json(quantity).encode()})
    _say(quantity)
    return 0


def _standard(
    arguments: argparse.Namespace,
) -> tuple[InternalStandard | None, Weighings | None]:
    """Standard and masses; none of both where no standard was weighed in."""
    given = [name for name in _STANDARD_OPTIONS if getattr(arguments, name) is not None]
    if not given:
        return None, None
    missing = [name for name in _STANDARD_OPTIONS if name not in given]
    if missing:
        raise UsageError(f"--{missing[0].replace('_', '-')} is needed with a standard")
    structure = read_structure(arguments.standard_structure)
    standard = InternalStandard(
        name=arguments.standard_name or structure.name or structure.smiles,
        molar_mass=float(MolWt(molecule(structure))),
        n_protons=arguments.standard_protons,
        shift_ppm=arguments.standard_at,
        purity=arguments.standard_purity,
        purity_u=arguments.standard_purity_u,
    )
    weighings = Weighings(
        sample_mg=arguments.sample_mass,
        standard_mg=arguments.standard_mass,
        u_mg=arguments.balance,
    )
    return standard, weighings


def _ledger(arguments: argparse.Namespace) -> Ledger:
    """Ledger of a project file, or of a spectrum and a structure.

    Raises
    ------
    UsageError
        If there is no structure.
    """
    with ProgressLine() as progress:
        if arguments.data.suffix.lower() == SUFFIX:
            now = datetime.datetime.now().astimezone().isoformat(timespec="seconds")
            solved = solve(load_project(arguments.data), when=now, progress=progress)
            if solved.ledger is None:
                raise UsageError(f"{arguments.data} has no spectrum or no structure")
            return solved.ledger
        if arguments.structure is None:
            raise UsageError("--structure is needed with a spectrum")
        job = Job(
            data=arguments.data,
            structure=arguments.structure,
            folder=arguments.out,
            solvent=solvent_of(arguments.solvent),
            prefer_processed=arguments.processed,
            options=options_of(arguments),
        )
        structure = read_structure(job.structure)
        evidence = read_evidence(job, progress)
        return reconcile(evidence, structure, options=job.options, progress=progress)


def _say(quantity: Quantity) -> None:
    for sentence in quantity_sentences(quantity):
        sys.stdout.write(f"{sentence}\n")
    for row in content_rows(quantity.content):
        name, _, _, mol, mass = row
        sys.stdout.write(f"  {name}: {mol} mol %, {mass} mass %\n")
