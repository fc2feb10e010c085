"""``spinledger rank``: candidate structures against one spectrum, best first."""

from __future__ import annotations

import argparse
import sys

from spinledger.cli.inputs import options_of, read_candidates, solvent_of
from spinledger.cli.progress import ProgressLine
from spinledger.detection.evidence import gather_evidence
from spinledger.io.read import read_acquired
from spinledger.reconcile.run import rank
from spinledger.report.files import check_writable, write_files
from spinledger.report.json_ranking import ranking_text


def run(arguments: argparse.Namespace) -> int:
    """Run the command."""
    solvent = solvent_of(arguments.solvent)
    options = options_of(arguments)
    candidates = read_candidates(arguments.candidates)
    check_writable(arguments.out)
    acquired = read_acquired(arguments.data, prefer_processed=arguments.processed)
    with ProgressLine() as progress:
        progress("processing the spectrum", 0.02)
        evidence = gather_evidence(
            acquired, solvent=solvent, temperature_k=arguments.temperature
        )
        ranking = rank(evidence, candidates, options=options, progress=progress)
    text = ranking_text(ranking, evidence)
    write_files(arguments.out, {"ranking.json": text.encode("utf-8")})
    for place, one in enumerate(ranking.candidates, start=1):
        share = "     -" if one.probability is None else f"{one.probability:6.3f}"
        sys.stdout.write(f"{place:3d} {share}  {one.verdict:<15s} {one.name}\n")
    return 0
