"""``spinledger mixture``: ratios, conversion, dr and E/Z of several compounds."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from spinledger.batch.job import Job, read_evidence
from spinledger.cli.inputs import options_of, read_candidates, solvent_of
from spinledger.cli.progress import ProgressLine
from spinledger.cli.reconcile import today
from spinledger.errors import StructureError
from spinledger.report.context import ReportContext
from spinledger.report.files import check_writable, write_files
from spinledger.report.mixture import mixture_csv, mixture_json
from spinledger.report.write import write_reports
from spinledger.sample.mixture import Component, Part, check_components, measure_mixture

_PARTS: dict[str, Part] = {
    "sm": "starting material",
    "product": "product",
    "by-product": "by-product",
}


def run(arguments: argparse.Namespace) -> int:
    """Run the command: mixture.json, mixture.csv and the reports of the fit."""
    components = components_of(arguments.components)
    check_components(components)
    options = options_of(arguments)
    check_writable(arguments.out)
    job = Job(
        data=arguments.data,
        structure=components[0].structure.smiles,
        folder=arguments.out,
        solvent=solvent_of(arguments.solvent),
        prefer_processed=arguments.processed,
        options=options,
    )
    with ProgressLine() as progress:
        evidence = read_evidence(job, progress)
        mixture = measure_mixture(
            evidence, components, options=options, progress=progress
        )
        write_reports(
            mixture.ledger, arguments.out, context=ReportContext(date=today())
        )
    write_files(
        arguments.out,
        {
            "mixture.csv": mixture_csv(mixture).encode("utf-8"),
            "mixture.json": mixture_json(mixture).encode("utf-8"),
        },
    )
    sys.stdout.write(f"{mixture.ledger.verdict.state}: {arguments.out}\n")
    for sentence in mixture.sentences():
        sys.stdout.write(f"  {sentence}\n")
    return 0


def components_of(path: Path) -> tuple[Component, ...]:
    """Components of a file, one ``SMILES name`` a line.

    A name that begins with "sm:" or "by-product:" is a starting material or a
    by-product; all others are products.

    Raises
    ------
    StructureError
        If one does not parse, or there are fewer than two.
    """
    rows = []
    for one in read_candidates(path):
        if one.structure is None:
            raise StructureError(one.name, one.reason or "it could not be read")
        word, colon, rest = one.name.partition(":")
        part = _PARTS.get(word.strip().lower()) if colon else None
        name = rest.strip() if part is not None else one.name
        rows.append(
            Component(name=name, structure=one.structure, part=part or "product")
        )
    if len(rows) < 2:
        raise StructureError(
            str(path), "a mixture needs two or more components, one a line"
        )
    return tuple(rows)
