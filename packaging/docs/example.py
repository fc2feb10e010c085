"""From raw data to a report, step by step; runs on the sample data."""

import sys
import tempfile
from pathlib import Path

from spinledger.detection.evidence import gather_evidence
from spinledger.io.read import read_acquired
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.report.context import ReportContext
from spinledger.report.text import TextOptions, experimental_text
from spinledger.report.write import write_reports
from spinledger.structure.read import read_structure

samples = Path(sys.argv[1] if len(sys.argv) > 1 else "sample_data")

# Read: any maker's folder or file, found by content.
acquired = read_acquired(samples / "batch-117")
print(
    acquired.metadata.format_name, acquired.metadata.spectrometer_frequency_mhz, "MHz"
)

# Process and detect: the evidence, before any structure is asked.
evidence = gather_evidence(acquired, solvent="CDCl3")
print(len(evidence.signals), "signals, reference", evidence.reference.by)

# Claim, match, refine, judge: the ledger.
structure = read_structure(str(samples / "structures" / "hydroxy-ester.mol"))
ledger = reconcile(evidence, structure, options=ReconcileOptions(quick=True))
print(ledger.verdict.state)
for entry in ledger.entries:
    if entry.shift_ppm is not None:
        print(f"{entry.claim:7s} {entry.shift_ppm:7.4f} ppm  {entry.multiplicity}")

# Report: text in a journal's form, and files.
print(experimental_text(ledger, TextOptions(style="rsc")))
with tempfile.TemporaryDirectory() as place:
    context = ReportContext(date="1 December 2026", sections=("assignment", "text"))
    for path in write_reports(
        ledger, Path(place), formats=("html", "csv"), context=context
    ):
        print(path.name, path.stat().st_size > 1000)
