"""Couplings of one compound in two acquired spectra: how well they agree.

Prints one JSON object: for each pair the couplings both determine, the largest
difference in Hz, and what is said to differ.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from shared_data import SHARED
from spinledger.detection.evidence import gather_evidence
from spinledger.io.read import read_acquired
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.sample.joint import joint_ledger
from spinledger.sample.joint_values import Witness
from spinledger.structure.read import read_structure

PAIRS = (
    ("brs_uridine_500-0p5mM", "brs_uridine_600-100mM"),
    ("br_gaba_metabohub", "br_gamma-aminobutyric-acid_bmse000871"),
    ("brn_menthol", "jc_menthol"),
)


def main() -> None:
    """Reconcile, join, print."""
    result = {" and ".join(pair): _pair(pair) for pair in PAIRS}
    sys.stdout.write(json.dumps(result, indent=1) + "\n")


def _pair(names: tuple[str, str]) -> dict[str, object]:
    joint = joint_ledger([_witness(name) for name in names])
    gaps = []
    for one in joint.couplings:
        values = [value.value for value in one.values if value is not None]
        if len(values) > 1:
            gaps.append(max(values) - min(values))
    return {
        "state": joint.state,
        "couplings": len(joint.couplings),
        "in_both": len(gaps),
        "largest_gap_hz": max(gaps, default=None),
        "differ": sum(not one.agrees for one in joint.couplings),
        "reasons": list(joint.reasons),
    }


def _witness(name: str) -> Witness:
    folder = SHARED / "acquired" / name
    smiles = json.loads((folder / "truth.json").read_text(encoding="utf-8"))["smiles"]
    ledger = reconcile(
        gather_evidence(read_acquired(folder / "raw")),
        read_structure(smiles),
        options=ReconcileOptions(quick=True),
    )
    return Witness(name=name, role="main", ledger=ledger)


if __name__ == "__main__":
    main()
