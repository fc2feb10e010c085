"""Invented ledger of ethyl 3-hydroxybutanoate, first-order lines plus noise."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np
import numpy.typing as npt

from spinledger.values.acquisition import MakerSpectrum, Metadata
from spinledger.values.claim import Claim, ClaimSet
from spinledger.values.evidence import (
    Evidence,
    Line,
    ProcessingQuality,
    Signal,
    Stray,
)
from spinledger.values.ledger import (
    Advice,
    Balance,
    ClaimLines,
    Contender,
    Entry,
    EntryCoupling,
    Ledger,
    Model,
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
SMILES = "CCOC(=O)C[C@@H](C)O"
MOLBLOCK = ""

# label, atoms, protons, predicted, sd, found, J to partners, predicted J
_GROUPS: tuple[tuple[object, ...], ...] = (
    ("3-H", (6,), 1, 4.11, 0.11, 4.190, {"2-HB": 8.60, "4-H": 6.31, "2-HA": 3.41}),
    ("1′-H", (1,), 2, 4.14, 0.05, 4.168, {"2′-H": 7.13}),
    ("OH", (8,), 1, 2.4, 0.8, 2.960, {}),
    ("2-HA", (5,), 1, 2.55, 0.10, 2.491, {"2-HB": -16.5, "3-H": 3.41}),
    ("2-HB", (5,), 1, 2.50, 0.10, 2.419, {"2-HA": -16.5, "3-H": 8.60}),
    ("2′-H", (0,), 3, 1.25, 0.03, 1.272, {"1′-H": 7.13}),
    ("4-H", (7,), 3, 1.20, 0.04, 1.223, {"3-H": 6.31}),
)
_PREDICTED_J = {
    frozenset(("3-H", "2-HB")): (7.4, 1.2),
    frozenset(("3-H", "4-H")): (6.4, 0.4),
    frozenset(("3-H", "2-HA")): (4.5, 1.3),
    frozenset(("1′-H", "2′-H")): (7.1, 0.2),
    frozenset(("2-HA", "2-HB")): (-15.8, 1.0),
}
_PATTERNS = {
    "3-H": "dqd",
    "1′-H": "q",
    "OH": "br s",
    "2-HA": "dd",
    "2-HB": "dd",
    "2′-H": "t",
    "4-H": "d",
}
_COUNTS = {str(group[0]): int(group[2]) for group in _GROUPS}  # type: ignore[call-overload]
_STRAYS = (
    (7.26, 0.11, 1.0, "solvent", "CHCl3: residual solvent."),
    (1.56, 0.10, 1.6, "water", "H2O: water in CDCl3."),
    (0.0, 0.22, 0.9, "reference", "TMS: reference line."),
)


def _lines(label: str) -> tuple[list[float], list[float]]:
    """First-order lines of one claim, ppm and protons."""
    group = next(one for one in _GROUPS if one[0] == label)
    lines = {float(group[5]) * FIELD_MHZ: float(group[2])}  # type: ignore[arg-type]
    for partner, j_hz in dict(group[6]).items():  # type: ignore[call-overload]
        for _ in range(_COUNTS[partner]):
            split: dict[float, float] = {}
            for place, area in lines.items():
                for half in (-j_hz / 2, j_hz / 2):
                    key = round(place + half, 4)
                    split[key] = split.get(key, 0.0) + area / 2
            lines = split
    places = sorted(lines, reverse=True)
    # Roof of the CH2 pair: inner lines taller, the sum as it was.
    tilt = {"2-HA": 0.22, "2-HB": -0.22}.get(label, 0.0)
    middle = sum(places) / len(places)
    areas = [lines[p] * (1 - tilt * np.sign(p - middle)) for p in places]
    return [p / FIELD_MHZ for p in places], areas


def _add(
    total: npt.NDArray[np.float64],
    axis_hz: npt.NDArray[np.float64],
    line: tuple[float, float, float],
) -> None:
    place_hz, area, width_hz = line
    half = width_hz / 2
    total += area * half / np.pi / ((axis_hz - place_hz) ** 2 + half**2)


@cache
def evidence(n_points: int = 65536, *, with_stray: bool = False) -> Evidence:
    """Processed spectrum with its signals."""
    first, width_hz = 10.5, 12.0 * FIELD_MHZ
    step_ppm = width_hz / n_points / FIELD_MHZ
    axis_hz = (first - step_ppm * np.arange(n_points)) * FIELD_MHZ
    total = np.zeros(n_points)
    for group in _GROUPS:
        label = str(group[0])
        width = 15.0 if label == "OH" else 0.95
        for place, area in zip(*_lines(label), strict=True):
            _add(total, axis_hz, (place * FIELD_MHZ, area, width))
    for shift, area, width, _, _ in _STRAYS:
        _add(total, axis_hz, (shift * FIELD_MHZ, area, width))
    if with_stray:
        _add(total, axis_hz, (2.316 * FIELD_MHZ, 0.16, 1.0))
    noise_sd = total.max() / 1600
    rng = np.random.default_rng(7)
    noisy = total + rng.normal(0, noise_sd, n_points)
    spectrum = Spectrum(
        intensities=noisy,
        first_point_ppm=first,
        spectral_width_hz=width_hz,
        spectrometer_frequency_mhz=FIELD_MHZ,
    )
    reference = Reference(offset_ppm=0.02, by="TMS", sd_ppm=0.0005, line_ppm=0.0)
    strays = tuple(
        Stray(low_ppm=s - 0.02, high_ppm=s + 0.02, kind=kind, why=why, protons=area)  # type: ignore[arg-type]
        for s, area, _, kind, why in _STRAYS
    )
    return Evidence(
        metadata=_metadata(),
        recipe=_recipe(reference),
        reference=reference,
        spectrum=spectrum,
        noise_sd=float(noise_sd),
        solvent="CDCl3",
        solvent_seen="CDCl3",
        solvent_header="CDCl3",
        signals=_signals(with_stray=with_stray),
        strays=strays,
        quality=ProcessingQuality(phase_sd_deg=0.4, baseline_sd=1.0),
    )


def _metadata() -> Metadata:
    return Metadata(
        source_name="batch-117",
        sha256="7c1e40d9a2b351f8" * 4,
        format_name="Bruker folder",
        nucleus="1H",
        spectrometer_frequency_mhz=FIELD_MHZ,
        solvent="CDCl3",
        temperature_k=298.0,
        n_scans=16,
        relaxation_delay_s=2.0,
        pulse_length_us=10.0,
    )


def _recipe(reference: Reference) -> Recipe:
    return Recipe(
        steps=(
            RemoveDelay(group_delay_points=67.98),
            Apodize(kind="exponential", line_broadening_hz=0.3),
            ZeroFill(n_points=131072),
            FourierTransform(halve_first_point=False),
            Phase(phase0_deg=-12.4, phase1_deg=3.1, automatic=False),
            Baseline(method="whittaker"),
            reference,
        )
    )


def _signals(*, with_stray: bool) -> tuple[Signal, ...]:
    together = (("3-H", "1′-H"), ("OH",), ("2-HA",), ("2-HB",), ("2′-H",), ("4-H",))
    signals = []
    for labels in together:
        lines = []
        for label in labels:
            width = 15.0 if label == "OH" else 0.95
            for place, area in zip(*_lines(label), strict=True):
                lines.append(_line(place, area, width))
        reach = 0.06 if labels == ("OH",) else 0.012
        low = min(line.shift_ppm for line in lines) - reach
        high = max(line.shift_ppm for line in lines) + reach
        area = sum(line.area for line in lines)
        area *= {"OH": 0.93, "2-HA": 1.01, "2-HB": 0.99}.get(labels[0], 1.004)
        signals.append(_signal(low, high, area, tuple(lines)))
    for shift, area, width, _, _ in _STRAYS:
        line = _line(shift, area, width)
        signals.append(_signal(shift - 0.02, shift + 0.02, area, (line,)))
    if with_stray:
        line = _line(2.316, 0.16, 1.0)
        signals.append(_signal(2.304, 2.328, 0.16, (line,)))
    return tuple(sorted(signals, key=lambda signal: -signal.high_ppm))


def _line(place: float, area: float, width: float) -> Line:
    return Line(
        shift_ppm=place,
        shift_sd_ppm=0.00005,
        area=area,
        area_sd=0.01,
        width_hz=width,
        width_sd_hz=0.02,
    )


def _signal(low: float, high: float, area: float, lines: tuple[Line, ...]) -> Signal:
    return Signal(low_ppm=low, high_ppm=high, area=area, area_sd=0.01, lines=lines)


def structure() -> Structure:
    """The claimed ester."""
    return Structure(
        given=SMILES,
        molblock=MOLBLOCK,
        smiles=SMILES,
        name="ethyl 3-hydroxybutanoate",
        locants=("2′", "1′", None, "1", None, "2", "3", "4", None),
    )


def claims() -> ClaimSet:
    """Claims of the ester in CDCl3, without couplings between particles."""
    made = [
        Claim(
            label=str(g[0]),
            atoms=tuple(g[1]),  # type: ignore[arg-type]
            n_protons=int(g[2]),  # type: ignore[call-overload]
            shift_ppm=float(g[3]),  # type: ignore[arg-type]
            shift_sd_ppm=float(g[4]),  # type: ignore[arg-type]
            visibility="optional" if g[0] == "OH" else "seen",
            is_exchangeable=g[0] == "OH",
        )
        for g in _GROUPS
    ]
    return ClaimSet(claims=tuple(made), particles=(), couplings=())


def _entries() -> tuple[Entry, ...]:
    found = {"3-H": 1.00, "1′-H": 2.01, "OH": 0.93, "2-HA": 1.01, "2-HB": 0.99}
    found |= {"2′-H": 3.02, "4-H": 3.01}
    entries = []
    for label, atoms, count, predicted, sd, shift, partners in _GROUPS:
        couplings = tuple(
            _coupling(str(label), partner, j)
            for partner, j in partners.items()  # type: ignore[attr-defined]
        )
        places, _ = _lines(str(label))
        z = (float(shift) - float(predicted)) / float(sd)  # type: ignore[arg-type]
        entries.append(
            Entry(
                claim=str(label),
                atoms=tuple(atoms),  # type: ignore[arg-type]
                species=0,
                protons=int(count),  # type: ignore[call-overload]
                state="settled",
                predicted_shift_ppm=float(predicted),  # type: ignore[arg-type]
                predicted_shift_sd_ppm=float(sd),  # type: ignore[arg-type]
                shift_ppm=float(shift),  # type: ignore[arg-type]
                shift_sd_ppm=0.0002,
                range_ppm=(min(places) - 0.012, max(places) + 0.012),
                integral_protons=found[str(label)],
                integral_sd_protons=0.04,
                multiplicity=_PATTERNS[str(label)],
                predicted_multiplicity=_PATTERNS[str(label)],
                width_hz=15.0 if label == "OH" else 0.95,
                couplings=couplings,
                shift_residual_sd=z,
                integral_residual_sd=-1.4 if label == "OH" else 0.3,
                j_residual_sd=None if label == "OH" else 0.8,
            )
        )
    return tuple(entries)


def _coupling(label: str, partner: str, j_hz: float) -> EntryCoupling:
    predicted, sd = _PREDICTED_J[frozenset((label, partner))]
    return EntryCoupling(
        partner=partner,
        j_hz=j_hz,
        j_sd_hz=0.02,
        determined=True,
        predicted_j_hz=predicted,
        predicted_j_sd_hz=sd,
        kind="geminal" if j_hz < 0 else "vicinal chain",
    )


@cache
def ledger(n_points: int = 65536) -> Ledger:
    """Reconciled ledger of the ester."""
    seen = evidence(n_points)
    axis_hz = seen.spectrum.shifts_ppm * FIELD_MHZ
    total = np.zeros(n_points)
    lines = []
    for group in _GROUPS:
        label = str(group[0])
        places, areas = _lines(label)
        width = 15.0 if label == "OH" else 0.95
        for place, area in zip(places, areas, strict=True):
            _add(total, axis_hz, (place * FIELD_MHZ, area, width))
        lines.append(
            ClaimLines(
                claim=label,
                shifts_ppm=np.array(places),
                protons=np.array(areas),
                width_hz=width,
            )
        )
    for shift, area, width, _, _ in _STRAYS:
        _add(total, axis_hz, (shift * FIELD_MHZ, area, width))
    return Ledger(
        evidence=seen,
        structure=structure(),
        claims=claims(),
        entries=_entries(),
        strays=seen.strays,
        balance=Balance(claimed=11.0, found=11.04, scale_signal="4-H"),
        verdict=Verdict(
            state="reconciled",
            probability=0.97,
            prior=0.5,
            likelihood_ratio=32.0,
            unique=True,
            reasons=(
                "Every proton is placed and no line is left unexplained.",
                "Largest residual −1.4 sd (OH integral).",
            ),
        ),
        model=Model(intensities=total, claim_lines=tuple(lines), area_per_proton=1.0),
        contenders=_contenders(),
        advice=_advice(),
        cautions=(
            "Consistent is not proven; only the listed contenders were tested.",
            "Relative configuration only: a spectrum in an achiral solvent says "
            "nothing of absolute configuration.",
        ),
    )


def _contenders() -> tuple[Contender, ...]:
    return (
        Contender(
            name="isopropyl 3-hydroxypropanoate",
            smiles="CC(C)OC(=O)CCO",
            origin="given",
            probability=0.02,
            verdict="undecided",
            excluded=False,
            why="OCH septet is 1.8 sd off.",
        ),
        Contender(
            name="ethyl 2-hydroxybutanoate",
            smiles="CCOC(=O)C(O)CC",
            origin="enumerated",
            probability=0.0,
            verdict="not reconciled",
            excluded=True,
            why="Needs a CH3 triplet at 0.95.",
        ),
        Contender(
            name="3-ethoxybutanoic acid",
            smiles="CCOC(C)CC(=O)O",
            origin="enumerated",
            probability=0.0,
            verdict="not reconciled",
            excluded=True,
            why="OCH2 shift is 4.4 sd off.",
        ),
    )


def _advice() -> tuple[Advice, ...]:
    return (
        Advice(
            measurement="D2O shake",
            expected_discrimination=3.1,
            look_for="which line is OH",
        ),
        Advice(
            measurement="COSY",
            expected_discrimination=0.4,
            look_for="nothing left to split",
        ),
    )


@cache
def disputed(n_points: int = 65536) -> Ledger:
    """The same with one J against its claim, one open, one silent, one stray."""
    base = ledger(n_points)
    seen = evidence(n_points, with_stray=True)
    entries = []
    for entry in base.entries:
        changed = entry
        if entry.claim in ("2-HB", "3-H"):
            couplings = tuple(
                replace(
                    c,
                    predicted_j_hz=4.9,
                    is_disputed=entry.claim == "2-HB",
                )
                if {entry.claim, c.partner} == {"2-HB", "3-H"}
                else c
                for c in entry.couplings
            )
            changed = replace(entry, couplings=couplings, j_residual_sd=3.1)
        if entry.claim == "2-HB":
            changed = replace(
                changed,
                state="disputed",
                reasons=(
                    "J(2-HB, 3-H) is 8.60 ± 0.02 Hz in the spectrum; 4.9 ± 1.2 "
                    "predicted, which is +3.1 sd. 3-H shows the same 8.60; it is "
                    "booked here once.",
                ),
            )
        entries.append(changed)
    stray = Stray(
        low_ppm=2.304,
        high_ppm=2.328,
        kind="unexplained",
        why="s, 0.16 H, no match.",
        protons=0.16,
    )
    return replace(
        base,
        evidence=seen,
        entries=tuple(entries),
        strays=(*seen.strays, stray),
        balance=Balance(claimed=11.0, found=11.2, scale_signal="4-H"),
        verdict=Verdict(
            state="undecided",
            probability=0.34,
            prior=0.5,
            likelihood_ratio=0.5,
            unique=False,
            reasons=(
                "One J is 3.1 sd from its prediction; one signal has no owner.",
                "To decide: D₂O shake, then NOE 2-HB to 4-H.",
            ),
        ),
    )


def maker_spectrum(n_points: int = 65536) -> MakerSpectrum:
    """The same spectrum as if it had come processed."""
    return MakerSpectrum(metadata=_metadata(), spectrum=evidence(n_points).spectrum)


@cache
def lost(n_points: int = 65536) -> Ledger:
    """The same with one claim open and one silent."""
    base = ledger(n_points)
    entries = []
    for entry in base.entries:
        if entry.claim == "2-HA":
            entries.append(_unfound(entry, "open", "Nothing is left in its range."))
        elif entry.claim == "OH":
            why = "Exchanges with D2O."
            entries.append(_unfound(entry, "silent", why))
        else:
            entries.append(entry)
    return replace(
        base,
        entries=tuple(entries),
        verdict=Verdict(
            state="not reconciled",
            probability=0.004,
            prior=0.5,
            likelihood_ratio=0.004,
            unique=False,
            reasons=("2-HA is not observed.",),
        ),
    )


def _unfound(entry: Entry, state: str, why: str) -> Entry:
    return replace(
        entry,
        state=state,  # type: ignore[arg-type]
        shift_ppm=None,
        shift_sd_ppm=None,
        range_ppm=None,
        integral_protons=None,
        multiplicity=None,
        shift_residual_sd=None,
        integral_residual_sd=None,
        j_residual_sd=None,
        why=why,
    )


@cache
def crowded(n_points: int, n_claims: int) -> Ledger:
    """A long spectrum with many double doublets side by side."""
    base = evidence(n_points)
    entries, lines, signals = [], [], []
    rng = np.random.default_rng(5)
    axis_hz = base.spectrum.shifts_ppm * FIELD_MHZ
    total = np.zeros(n_points)
    for k in range(n_claims):
        shift = 0.8 + 6.5 * k / n_claims + float(rng.uniform(0, 0.05))
        j_hz = (float(rng.uniform(9, 14)), float(rng.uniform(2, 7)))
        places = [
            shift + (a * j_hz[0] + b * j_hz[1]) / 2 / FIELD_MHZ
            for a in (1, -1)
            for b in (1, -1)
        ]
        for place in places:
            _add(total, axis_hz, (place * FIELD_MHZ, 0.25, 1.0))
        claim = f"{k + 1}-H"
        neighbours = (f"{(k + 1) % n_claims + 1}-H", f"{(k + 2) % n_claims + 1}-H")
        lines.append(
            ClaimLines(
                claim=claim,
                shifts_ppm=np.array(places),
                protons=np.full(4, 0.25),
                width_hz=1.0,
            )
        )
        low, high = min(places) - 0.01, max(places) + 0.01
        signals.append(
            _signal(low, high, 1.0, tuple(_line(p, 0.25, 1.0) for p in places))
        )
        entries.append(
            Entry(
                claim=claim,
                atoms=(k % 9,),
                species=0,
                protons=1,
                state="settled",
                predicted_shift_ppm=shift + 0.05,
                predicted_shift_sd_ppm=0.2,
                shift_ppm=shift,
                shift_sd_ppm=0.0002,
                range_ppm=(low, high),
                integral_protons=1.0,
                multiplicity="dd",
                predicted_multiplicity="dd",
                couplings=tuple(
                    EntryCoupling(
                        partner=partner,
                        j_hz=j,
                        j_sd_hz=0.02,
                        determined=True,
                        predicted_j_hz=j,
                        predicted_j_sd_hz=1.0,
                        kind="vicinal chain",
                    )
                    for partner, j in zip(neighbours, j_hz, strict=True)
                ),
                shift_residual_sd=0.2,
                j_residual_sd=0.1,
                integral_residual_sd=0.0,
            )
        )
    noise_sd = total.max() / 1600
    noise = np.random.default_rng(7).normal(0, noise_sd, n_points)
    seen = replace(
        base,
        spectrum=replace(base.spectrum, intensities=total + noise),
        noise_sd=float(noise_sd),
        signals=tuple(sorted(signals, key=lambda signal: -signal.high_ppm)),
        strays=(),
    )
    return replace(
        ledger(),
        evidence=seen,
        entries=tuple(entries),
        strays=(),
        model=Model(intensities=total, claim_lines=tuple(lines), area_per_proton=1.0),
    )
