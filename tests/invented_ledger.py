"""An invented ledger: ethyl 3-hydroxybutanoate in CDCl3, lines drawn first order.

Nothing here was measured and nothing was solved; the numbers only have to be
consistent with each other.
"""

import functools
from dataclasses import replace

import numpy as np

from spinledger.values.acquisition import Fid, Metadata
from spinledger.values.claim import Claim, ClaimSet, CouplingClaim, Particle
from spinledger.values.evidence import (
    Evidence,
    Line,
    ProcessingQuality,
    Signal,
    Stray,
)
from spinledger.values.geometry import DihedralShare, Geometry
from spinledger.values.ledger import (
    Advice,
    Balance,
    ClaimLines,
    Contender,
    Entry,
    EntryCoupling,
    EntryGroup,
    Ledger,
    Model,
    SideFinding,
    Verdict,
)
from spinledger.values.recipe import (
    Apodize,
    Baseline,
    FourierTransform,
    Phase,
    Recipe,
    Reference,
    RemoveDelay,
    ZeroFill,
)
from spinledger.values.spectrum import Spectrum
from spinledger.values.structure import Structure

FIELD_MHZ = 400.13
SMILES = "CCOC(=O)CC(C)O"
WIDTH_HZ = 0.95
N_POINTS = 32768
MOLBLOCK = """
     SpinLedger          2D

  0  0  0     0  0            999 V3000
M  V30 BEGIN CTAB
M  V30 COUNTS 9 8 0 0 0
M  V30 BEGIN ATOM
M  V30 1 C 0 0 0 0
M  V30 2 C 1.299 0.75 0 0
M  V30 3 O 2.598 0 0 0
M  V30 4 C 3.897 0.75 0 0
M  V30 5 O 3.897 2.25 0 0
M  V30 6 C 5.196 0 0 0
M  V30 7 C 6.495 0.75 0 0
M  V30 8 C 7.794 0 0 0
M  V30 9 O 6.495 2.25 0 0
M  V30 END ATOM
M  V30 BEGIN BOND
M  V30 1 1 1 2
M  V30 2 1 2 3
M  V30 3 1 3 4
M  V30 4 2 4 5
M  V30 5 1 4 6
M  V30 6 1 6 7
M  V30 7 1 7 8
M  V30 8 1 7 9
M  V30 END BOND
M  V30 END CTAB
M  END
"""

# label: (atom, protons, shift, predicted, sd, pattern, couplings, width in Hz)
_ROWS = {
    "3-H": (6, 1, 4.1903, 4.11, 0.11, "dqd", (("2-HB", 8.60), ("4-H", 6.31), ("2-HA", 3.41)), WIDTH_HZ),
    "1'-H": (1, 2, 4.1684, 4.14, 0.05, "q", (("2'-H", 7.13),), WIDTH_HZ),
    "3-OH": (8, 1, 2.960, 2.4, 0.8, "br s", (), 15.0),
    "2-HA": (5, 1, 2.4910, 2.55, 0.10, "dd", (("2-HB", -16.50), ("3-H", 3.41)), WIDTH_HZ),
    "2-HB": (5, 1, 2.4190, 2.50, 0.10, "dd", (("2-HA", -16.50), ("3-H", 8.60)), WIDTH_HZ),
    "2'-H": (0, 3, 1.2720, 1.25, 0.03, "t", (("1'-H", 7.13),), WIDTH_HZ),
    "4-H": (7, 3, 1.2230, 1.20, 0.04, "d", (("3-H", 6.31),), WIDTH_HZ),
}  # fmt: skip
_FOUND = {
    "3-H": 1.00,
    "1'-H": 2.01,
    "3-OH": 0.93,
    "2-HA": 1.01,
    "2-HB": 0.99,
    "2'-H": 3.02,
    "4-H": 3.01,
}
_KINDS = {("2-HA", "2-HB"): ("geminal", 2, -16.0, 1.0, True)}


def invented_fid() -> Fid:
    """A short FID of one line, only to be carried about."""
    times = np.arange(256)
    rng = np.random.default_rng(3)
    samples = np.exp((0.4j - 0.01) * times) + 0.01 * rng.standard_normal(256)
    return Fid(
        metadata=invented_metadata(),
        samples=samples,
        spectral_width_hz=4000.0,
        carrier_ppm=4.7,
    )


def invented_metadata() -> Metadata:
    """Facts of the invented acquisition."""
    return Metadata(
        source_name="batch-117",
        sha256="7c1e40d9a2b351f8" * 4,
        format_name="Bruker folder",
        nucleus="1H",
        spectrometer_frequency_mhz=FIELD_MHZ,
        solvent="CDCl3",
        temperature_k=298.0,
        n_scans=16,
        pulse_angle_deg=30.0,
        relaxation_delay_s=1.0,
    )


def invented_recipe() -> Recipe:
    """Recipe with every kind of step."""
    return Recipe(
        steps=(
            RemoveDelay(group_delay_points=67.98),
            Apodize(kind="exponential", line_broadening_hz=0.3),
            ZeroFill(n_points=65536),
            FourierTransform(halve_first_point=False),
            Phase(phase0_deg=34.2, phase1_deg=-3.1),
            Baseline(method="whittaker", masked_ppm=((1.1, 1.4), (4.0, 4.4))),
            Reference(
                offset_ppm=-0.012,
                by="TMS",
                sd_ppm=0.0005,
                line_ppm=0.0,
                why="TMS seen.",
            ),
        )
    )


def splitting(
    shift_ppm: float, couplings: list[tuple[float, int]]
) -> tuple[np.ndarray, np.ndarray]:
    """First-order lines of one proton group: shifts in ppm and shares."""
    shifts = np.array([shift_ppm * FIELD_MHZ])
    shares = np.array([1.0])
    for j_hz, n_partners in couplings:
        for _ in range(n_partners):
            shifts = np.concatenate([shifts - j_hz / 2, shifts + j_hz / 2])
            shares = np.concatenate([shares, shares]) / 2
    keys, inverse = np.unique(np.round(shifts, 4), return_inverse=True)
    return keys / FIELD_MHZ, np.bincount(inverse, shares)


def claim_lines() -> tuple[ClaimLines, ...]:
    """First-order lines of every claim."""
    found = []
    for label, (_, protons, shift, _, _, _, couplings, width) in _ROWS.items():
        pairs = [(abs(j), _ROWS[partner][1]) for partner, j in couplings]
        shifts, shares = splitting(shift, pairs)
        found.append(
            ClaimLines(
                claim=label, shifts_ppm=shifts, protons=shares * protons, width_hz=width
            )
        )
    return tuple(found)


def _add_line(
    axis_ppm: np.ndarray, shift_ppm: float, area: float, width_hz: float
) -> np.ndarray:
    half = width_hz / 2
    distance = (axis_ppm - shift_ppm) * FIELD_MHZ
    return area * half / np.pi / (distance**2 + half**2)


@functools.cache
def invented_spectrum() -> tuple[Spectrum, np.ndarray, float]:
    """Measured spectrum, model intensities and noise sd."""
    width_hz = 10.0 * FIELD_MHZ
    axis = 9.5 - np.arange(N_POINTS) * 10.0 / N_POINTS
    model = np.zeros(N_POINTS)
    for lines in claim_lines():
        for shift, protons in zip(lines.shifts_ppm, lines.protons, strict=True):
            model += _add_line(axis, shift, protons, lines.width_hz)
    measured = model.copy()
    for shift, area, width in ((7.26, 0.11, 0.95), (1.56, 0.10, 1.6), (0.0, 0.22, 0.8)):
        measured += _add_line(axis, shift, area, width)
    measured += _add_line(axis, 2.12, 0.05, 1.0)  # something nobody owns
    noise_sd = float(measured.max()) / 1600
    measured += np.random.default_rng(7).normal(0, noise_sd, N_POINTS)
    spectrum = Spectrum(
        intensities=measured,
        first_point_ppm=9.5,
        spectral_width_hz=width_hz,
        spectrometer_frequency_mhz=FIELD_MHZ,
    )
    return spectrum, model, noise_sd


def _signal(low_ppm: float, high_ppm: float, area: float) -> Signal:
    middle = (low_ppm + high_ppm) / 2
    line = Line(
        shift_ppm=middle,
        shift_sd_ppm=0.0002,
        area=area,
        area_sd=0.01,
        width_hz=WIDTH_HZ,
        width_sd_hz=0.05,
    )
    return Signal(
        low_ppm=low_ppm, high_ppm=high_ppm, area=area, area_sd=0.01, lines=(line,)
    )


def invented_strays() -> tuple[Stray, ...]:
    """Solvent, water, reference and one line without an owner."""
    return (
        Stray(low_ppm=7.25, high_ppm=7.27, kind="solvent", why="CHCl3 in CDCl3."),
        Stray(low_ppm=1.55, high_ppm=1.57, kind="water", why="H2O in CDCl3."),
        Stray(low_ppm=-0.01, high_ppm=0.01, kind="reference", why="TMS."),
        Stray(
            low_ppm=2.11,
            high_ppm=2.13,
            kind="unexplained",
            why="No claim and no table impurity owns this line.",
            protons=0.05,
        ),
    )


def invented_evidence() -> Evidence:
    """Evidence side with every signal and stray."""
    spectrum, _, noise_sd = invented_spectrum()
    ranges = (
        (7.25, 7.27, 0.11),
        (4.13, 4.24, 3.0),
        (2.80, 3.12, 0.93),
        (2.38, 2.54, 2.0),
        (2.11, 2.13, 0.05),
        (1.55, 1.57, 0.10),
        (1.20, 1.30, 6.0),
        (-0.01, 0.01, 0.22),
    )
    recipe = invented_recipe()
    reference = recipe.find(Reference)
    assert isinstance(reference, Reference)
    return Evidence(
        metadata=invented_metadata(),
        recipe=recipe,
        reference=reference,
        spectrum=spectrum,
        noise_sd=noise_sd,
        solvent="CDCl3",
        solvent_seen="CDCl3",
        solvent_header="CDCl3",
        signals=tuple(_signal(*one) for one in ranges),
        strays=invented_strays()[:3],
        quality=ProcessingQuality(phase_sd_deg=0.5, baseline_sd=1.1),
    )


def _coupling_facts(first: str, second: str) -> tuple[str, int, float, float, bool]:
    pair = (first, second) if first < second else (second, first)
    return _KINDS.get(pair, ("vicinal chain", 3, 7.0, 1.5, False))


def invented_claims() -> ClaimSet:
    """Claims with particles and couplings."""
    labels = list(_ROWS)
    claims = tuple(
        Claim(
            label=label,
            atoms=(atom,),
            n_protons=protons,
            shift_ppm=predicted,
            shift_sd_ppm=sd,
            visibility="optional" if label == "3-OH" else "seen",
            is_exchangeable=label == "3-OH",
            pair={"2-HA": "2-HB", "2-HB": "2-HA"}.get(label),
            shift_source="invented",
        )
        for label, (atom, protons, _, predicted, sd, *_) in _ROWS.items()
    )
    particles = tuple(
        Particle(
            claim=index,
            nucleus="1H",
            n_spins=claim.n_protons,
            hydrogens=tuple(range(9 + 3 * index, 9 + 3 * index + claim.n_protons)),
        )
        for index, claim in enumerate(claims)
    )
    couplings = []
    for first, (*_, pairs, _width) in _ROWS.items():
        for second, _ in pairs:
            a, b = labels.index(first), labels.index(second)
            if a < b:
                kind, bonds, j_hz, sd, rigid = _coupling_facts(first, second)
                couplings.append(
                    CouplingClaim(
                        pairs=((a, b),),
                        j_hz=j_hz,
                        j_sd_hz=sd,
                        kind=kind,
                        bonds=bonds,
                        is_rigid=rigid,
                    )
                )
    return ClaimSet(
        claims=claims,
        particles=particles,
        couplings=tuple(couplings),
        species_smiles=(SMILES,),
    )


def _range(label: str) -> tuple[float, float]:
    lines = next(one for one in claim_lines() if one.claim == label)
    margin = 2 * lines.width_hz / FIELD_MHZ
    return (
        float(lines.shifts_ppm.min()) - margin,
        float(lines.shifts_ppm.max()) + margin,
    )


def _entry(label: str) -> Entry:
    atom, protons, shift, predicted, sd, pattern, couplings, width = _ROWS[label]
    facts = [_coupling_facts(label, partner) for partner, _ in couplings]
    return Entry(
        claim=label,
        atoms=(atom,),
        species=0,
        protons=protons,
        state="settled",
        predicted_shift_ppm=predicted,
        predicted_shift_sd_ppm=sd,
        shift_ppm=shift,
        shift_sd_ppm=0.0006 if label == "3-OH" else 0.00004,
        range_ppm=_range(label),
        integral_protons=_FOUND[label],
        integral_sd_protons=0.05 if label == "3-OH" else 0.02,
        multiplicity=pattern,
        predicted_multiplicity=pattern,
        width_hz=width,
        couplings=tuple(
            EntryCoupling(
                partner=partner,
                j_hz=j_hz,
                j_sd_hz=0.02,
                determined=True,
                predicted_j_hz=fact[2],
                predicted_j_sd_hz=fact[3],
                kind=fact[0],
            )
            for (partner, j_hz), fact in zip(couplings, facts, strict=True)
        ),
        shift_residual_sd=(shift - predicted) / sd,
        integral_residual_sd=-1.4 if label == "3-OH" else 0.5,
        j_residual_sd=(abs(couplings[0][1]) - 7.0) / 1.5 if couplings else None,
    )


@functools.cache
def invented_ledger() -> Ledger:
    """Everything settled, one line unexplained."""
    _, model, _ = invented_spectrum()
    return Ledger(
        evidence=invented_evidence(),
        structure=Structure(
            given=SMILES,
            molblock=MOLBLOCK,
            smiles="CCOC(=O)CC(C)O",
            name="Ethyl 3-hydroxybutanoate",
            locants=("2'", "1'", None, "1", None, "2", "3", "4", None),
        ),
        claims=invented_claims(),
        entries=tuple(_entry(label) for label in _ROWS),
        strays=invented_strays(),
        balance=Balance(claimed=11.0, found=11.04, scale_signal="2'-H"),
        verdict=Verdict(
            state="reconciled",
            probability=0.97,
            prior=0.5,
            likelihood_ratio=32.3,
            unique=True,
            reasons=(
                "All 12 protons are placed.",
                "The largest residual is −1.4 sd (3-OH integral).",
            ),
        ),
        model=Model(intensities=model, claim_lines=claim_lines(), area_per_proton=1.0),
        contenders=(
            Contender(
                name="ethyl 2-hydroxybutanoate",
                smiles="CCOC(=O)C(O)CC",
                origin="enumerated",
                probability=0.001,
                verdict="not reconciled",
                excluded=True,
                why="The shift of 2-H is 9.1 sd away.",
            ),
        ),
        advice=(
            Advice(
                measurement="D2O shake",
                expected_discrimination=0.4,
                look_for="The broad line at 2.96 ppm goes.",
            ),
        ),
        cautions=("1'-HA and 1'-HB are diastereotopic but not resolved here.",),
        side=(
            SideFinding(
                kind="COSY",
                sentence="the COSY pairs agree",
                cost=0.0,
            ),
        ),
        geometry=Geometry(
            n_conformers=12,
            effective_share=0.9,
            misfit_before=1.4,
            misfit_after=0.3,
            dihedrals=(
                DihedralShare(
                    first="2-HA",
                    second="3-H",
                    is_in_ring=False,
                    j_hz=8.6,
                    j_sd_hz=0.02,
                    fitted_j_hz=8.5,
                    anti_share=0.62,
                    anti_share_sd=0.05,
                    prior_anti_share=0.4,
                    angle_deg=131.0,
                    angle_sd_deg=55.0,
                ),
            ),
            configurations=(),
            sentences=(
                "J(2-HA, 3-H) = 8.6 Hz: 62 ± 5 % antiperiplanar (force field 40 %)",
            ),
        ),
    )


def with_entry(ledger: Ledger, label: str, **changes: object) -> Ledger:
    """Ledger in which one entry has other values."""
    entries = tuple(
        replace(entry, **changes) if entry.claim == label else entry  # type: ignore[arg-type]
        for entry in ledger.entries
    )
    return replace(ledger, entries=entries)


def overlapped_ledger() -> Ledger:
    """3-H and 1'-H booked as one shared signal; the OH exchanged; 4-H disputed."""
    ledger = invented_ledger()
    both = (4.13, 4.23)
    ledger = with_entry(
        ledger,
        "3-H",
        range_ppm=both,
        group=EntryGroup(kind="shared", partners=("1'-H",)),
    )
    ledger = with_entry(
        ledger,
        "1'-H",
        range_ppm=both,
        group=EntryGroup(kind="shared", partners=("3-H",)),
    )
    ledger = with_entry(
        ledger,
        "3-OH",
        state="silent",
        shift_ppm=None,
        shift_sd_ppm=None,
        range_ppm=None,
        integral_protons=None,
        multiplicity=None,
        why="Exchanged for deuterium.",
    )
    ledger = with_entry(
        ledger, "4-H", state="disputed", reasons=("The integral is 4.2 sd too large.",)
    )
    for first, second in (("2-HA", "2-HB"), ("2-HB", "2-HA")):
        ledger = with_entry(
            ledger,
            first,
            group=EntryGroup(kind="interchangeable", partners=(second,), odds=0.6),
        )
    return ledger
