"""What the working process does; every function takes progress and cancelled.

Heavy imports stand inside the functions: the window's process reads this module
too, and must not load what it never runs.
"""

# ruff: noqa: PLC0415 - see above

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

from spinledger.project.document import Project, ProjectOptions
from spinledger.reconcile.options import ReconcileOptions
from spinledger.values.acquisition import Acquired
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Ledger
from spinledger.values.recipe import Recipe
from spinledger.values.structure import Structure
from spinledger_app.presenters.structure import Drawing

if TYPE_CHECKING:
    import numpy as np
    import numpy.typing as npt

    from spinledger.report.context import ReportContext
    from spinledger.sample.shake import Shake
    from spinledger_app.presenters.what_if import WhatIf

Progress = Callable[[str, float], None]
Cancelled = Callable[[], bool]

_LONGEST_PATH = 1024


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class ReadSpectrum:
    """A spectrum as it was read, and what it says."""

    acquired: Acquired
    evidence: Evidence


@dataclass(frozen=True, slots=True, kw_only=True)
class ReadClaim:
    """A structure and its drawing."""

    structure: Structure
    drawing: Drawing


def warm_up_reading(_progress: Progress, _cancelled: Cancelled) -> None:
    """Load what reading a spectrum needs."""
    import spinledger.detection.evidence
    import spinledger.io.read  # noqa: F401 - loaded so that it is at hand


def warm_up_solving(_progress: Progress, _cancelled: Cancelled) -> None:
    """Load what structures and reconciling need."""
    import spinledger_app.presenters.drawing  # noqa: F401 - loaded to be at hand


WARM_UPS = (warm_up_reading, warm_up_solving)


def read_spectrum(
    progress: Progress, cancelled: Cancelled, path: Path, options: ProjectOptions
) -> ReadSpectrum:
    """Read a data set and gather its evidence."""
    from spinledger.io.read import read_acquired

    progress("reading", 0.1)
    acquired = read_acquired(path, prefer_processed=options.prefer_processed)
    progress("processing", 0.4)
    evidence = gather(progress, cancelled, acquired, options, None)
    return ReadSpectrum(acquired=acquired, evidence=evidence)


def gather(
    progress: Progress,
    _cancelled: Cancelled,
    acquired: Acquired,
    options: ProjectOptions,
    recipe: Recipe | None,
) -> Evidence:
    """Evidence of a spectrum by a recipe, or by the program's own."""
    from spinledger.detection.evidence import gather_evidence

    progress("processing", 0.5)
    return gather_evidence(
        acquired,
        solvent=options.solvent,
        temperature_k=options.temperature_k,
        recipe=recipe,
    )


def read_claim(_progress: Progress, _cancelled: Cancelled, text: str) -> ReadClaim:
    """Structure from SMILES, InChI, CDXML, a molfile text or a file, and its drawing."""
    from spinledger.structure.read import read_structure
    from spinledger_app.presenters.drawing import drawing_of
    from spinledger_app.sketch.chemistry import molfile_of_cdxml

    if Path(text).suffix.lower() == ".cdxml" and len(text) < _LONGEST_PATH:
        text = Path(text).read_text(encoding="utf-8", errors="replace")
    if "<CDXML" in text:
        text = molfile_of_cdxml(text)
    structure = read_structure(text)
    return ReadClaim(structure=structure, drawing=drawing_of(structure))


def draw_structure(
    _progress: Progress, _cancelled: Cancelled, structure: Structure
) -> Drawing:
    """Drawing of a structure that was read before."""
    from spinledger_app.presenters.drawing import drawing_of

    return drawing_of(structure)


def draw_smiles(
    _progress: Progress, _cancelled: Cancelled, smiles: Sequence[str]
) -> dict[str, Drawing]:
    """Drawings of contenders by their SMILES; those that do not parse are left out."""
    from spinledger.errors import StructureError
    from spinledger.structure.read import read_structure
    from spinledger_app.presenters.drawing import drawing_of

    drawings = {}
    for one in smiles:
        try:
            drawings[one] = drawing_of(read_structure(one))
        except StructureError:
            continue  # the card says why in words
    return drawings


def solve(
    progress: Progress,
    cancelled: Cancelled,
    evidence: Evidence,
    structure: Structure,
    options: ReconcileOptions,
) -> Ledger:
    """Reconcile evidence and structure."""
    from spinledger.reconcile.run import reconcile

    return reconcile(
        evidence, structure, options=options, progress=progress, cancelled=cancelled
    )


def claims_at_field(
    _progress: Progress, _cancelled: Cancelled, asked: WhatIf, frequency_mhz: float
) -> npt.NDArray[np.float64]:
    """Spectrum of the claims at another field, on the spectrum's own axis."""
    from spinledger_app.presenters.what_if import drawn_at

    return drawn_at(asked, frequency_mhz)


def model_of(
    progress: Progress,
    cancelled: Cancelled,
    evidence: Evidence,
    smiles: str,
    options: ReconcileOptions,
) -> npt.NDArray[np.float64]:
    """Model of another structure on the same spectrum, quickly fitted."""
    from spinledger.errors import StructureError
    from spinledger.reconcile.options import Constraints
    from spinledger.structure.read import read_structure

    # The hand edits are those of the claimed structure, not of this one.
    options = replace(options, quick=True, constraints=Constraints())
    structure = read_structure(smiles)
    ledger = solve(progress, cancelled, evidence, structure, options)
    if ledger.model is None:
        raise StructureError(smiles, "None of its claims could be put to a line.")
    return ledger.model.intensities


def write_report(
    progress: Progress,
    _cancelled: Cancelled,
    ledger: Ledger,
    folder: Path,
    formats: Sequence[str],
    context: ReportContext,
) -> tuple[Path, ...]:
    """Write the report's files into a folder, all or none."""
    from spinledger.report.write import write_reports

    return write_reports(
        ledger, folder, formats=tuple(formats), context=context, progress=progress
    )


def write_pdf(
    progress: Progress,
    _cancelled: Cancelled,
    ledger: Ledger,
    path: Path,
    context: ReportContext,
) -> Path:
    """Write the report as PDF."""
    from spinledger_app.pdf.report import write_pdf_report

    progress("setting the pages", 0.3)
    return write_pdf_report(ledger, path, context)


def experimental_sentence(
    _progress: Progress, _cancelled: Cancelled, ledger: Ledger
) -> str:
    """The experimental-section text of a ledger."""
    from spinledger.report.text import experimental_text

    return experimental_text(ledger)


def load(_progress: Progress, _cancelled: Cancelled, path: Path) -> Project:
    """Read a project file."""
    from spinledger.project.storage import load_project

    return load_project(path)


def save(
    _progress: Progress, _cancelled: Cancelled, project: Project, path: Path
) -> Path:
    """Write a project file, whole or not at all."""
    from spinledger.project.storage import save_project

    save_project(project, path)
    return path


def shake(
    _progress: Progress, _cancelled: Cancelled, ledger: Ledger, after: Evidence
) -> Shake:
    """What the spectrum after a D2O shake says of the one before."""
    from spinledger.sample.shake import shake_pair

    return shake_pair(ledger, after)
