"""What a reader must keep in mind, where it applies."""

from __future__ import annotations

from rdkit import Chem

from spinledger.reconcile.evaluate import Evaluation
from spinledger.structure.read import molecule

LEAST_DELAY_S = 10.0
CALIBRATED_MHZ = (300.0, 900.0)
CALIBRATED_SOLVENTS = frozenset({"D2O", "CDCl3", "DMSO-d6", "acetone-d6", "CD3OD"})


def cautions(evaluation: Evaluation) -> tuple[str, ...]:
    """Cautions for one ledger, fixed ones first."""
    said = ["consistent is not proven, and only the listed contenders were tested"]
    mol = molecule(evaluation.structure)
    if Chem.FindMolChiralCenters(  # type: ignore[no-untyped-call]  # RDKit
        mol, includeUnassigned=True, useLegacyImplementation=False
    ):
        said.append(
            "relative configuration only: the mirror image gives the same spectrum"
        )
    said += _of_structure(evaluation, mol)
    said += _of_measurement(evaluation)
    said += _of_fit(evaluation)
    return tuple(said)


def _of_structure(evaluation: Evaluation, mol: Chem.Mol) -> list[str]:
    said = list(evaluation.claims.notes)
    bare = [
        part
        for part in Chem.GetMolFrags(mol, asMols=True)
        if sum(atom.GetTotalNumHs() for atom in part.GetAtoms()) == 0
    ]
    if bare:
        names = ", ".join(sorted({Chem.MolToSmiles(part) for part in bare}))
        said.append(f"a proton spectrum does not show {names}")
    return said


def _of_measurement(evaluation: Evaluation) -> list[str]:
    evidence = evaluation.evidence
    metadata = evidence.metadata
    said = list(evidence.quality.doubts)
    if (
        metadata.relaxation_delay_s is None
        or metadata.relaxation_delay_s < LEAST_DELAY_S
    ):
        said.append(
            "integrals are good to 5-10 % at best with a short or unknown delay "
            "between scans; do not read contents from them"
        )
    if evidence.presaturated:
        said.append("water was suppressed: signals near it are too small")
    if evidence.solvent is None:
        said.append("no solvent is known; predictions were made for an average one")
    elif evidence.solvent not in CALIBRATED_SOLVENTS:
        said.append(f"the verdict was not calibrated in {evidence.solvent}")
    if evidence.reference.by in {"header", "match"}:
        said.append(
            "no reference signal was found: the shift scale is the header's, moved "
            f"as the claims ask, and unsure by {evidence.reference.sd_ppm:.2f} ppm"
        )
    if metadata.temperature_k is None:
        said.append("the temperature is not known; 298 K was assumed")
    low, high = CALIBRATED_MHZ
    frequency = evidence.spectrum.spectrometer_frequency_mhz
    if not low - 5.0 <= frequency <= high + 5.0:
        said.append(f"the verdict was not calibrated at {frequency:.0f} MHz")
    return said


def _of_fit(evaluation: Evaluation) -> list[str]:
    if evaluation.solution is None or evaluation.booking is None:
        return []
    said = ["standard deviations of the fit assume that the assignment is right"]
    entries = evaluation.booking.entries
    if any(entry.group and entry.group.kind == "shared" for entry in entries):
        said.append("shifts and J of overlapping signals come from the model")
    if any(not row.determined for entry in entries for row in entry.couplings):
        said.append("J that the data do not determine are withheld")
    refinement = evaluation.solution.best.refinement
    if refinement.reason:
        said.append(refinement.reason)
    return said
