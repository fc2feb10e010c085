"""Fits of made and acquired spectra; prints one JSON object.

Run: ``python tests/benchmarks/fits.py [--draws N] [--made SYSTEM ...] [--starts N] [NAME ...]``.
Acquired spectra are started from the published values, shifts +- 0.03 ppm and J
+- 2 Hz; a fit succeeds if all shifts come within 0.004 ppm. Claims that may be
exchanged without changing the model's spectrum may stand either way round, claims
under a recognised stray are not counted, and a common offset of five or more
published shifts is taken out. Some published values are no minimum of the spectrum
they stand beside: a fit that starts on them leaves them by more than 0.004 ppm.
These are named, and success is also given without them.
"""

from __future__ import annotations

import argparse
import json
import os
import sys
import time
from collections import Counter
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(name, "1")
sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

import numpy as np  # noqa: E402 - after the number of threads is set
import numpy.typing as npt  # noqa: E402
from rdkit import Chem  # noqa: E402

from core.reconcile.refine_cases import made_evidence  # noqa: E402
from core.reconcile.test_refine import (  # noqa: E402
    ABX,
    AMX,
    RING,
    crb_sds,
    efficient_estimator,
)
from core.spins.spin_cases import claim_set  # noqa: E402
from shared_data import SHARED  # noqa: E402
from spinledger.detection.evidence import gather_evidence  # noqa: E402
from spinledger.io.read import read_acquired  # noqa: E402
from spinledger.reconcile.exchange import like_pairs  # noqa: E402
from spinledger.reconcile.options import Constraints, Pin  # noqa: E402
from spinledger.reconcile.refine import (  # noqa: E402
    FROM_AFAR,
    Refinement,
    RefineSettings,
    Start,
    refine,
)
from spinledger.reconcile.refine_data import prepare  # noqa: E402
from spinledger.values.claim import (  # noqa: E402
    Claim,
    ClaimSet,
    CouplingClaim,
    Particle,
)
from spinledger.values.evidence import Evidence  # noqa: E402

Floats = npt.NDArray[np.float64]

CHAIN = claim_set(
    [(f"{k}-H", [1], 1.2 + 0.35 * k) for k in range(7)],
    [([(k, k + 1)], 7.0 + 0.3 * k) for k in range(6)],
)
MADE = {"AMX": AMX, "ABX": ABX, "AA'BB'": RING, "chain of 7": CHAIN}

# Lines of 1 Hz, five points each; an eighth of them Gauss, so that the share's
# bound at 0 plays no part.
STEP_HZ = 0.2
GAUSS_SHARE = 0.125

# The published set names one anomer of the two that are in the tube.
LEFT_OUT = ("br_d-glucose_bmse000015",)


@dataclass(frozen=True)
class Published:
    """Claims with published values, and which couplings are trusted."""

    claims: ClaimSet
    is_trusted: npt.NDArray[np.bool_]


def published(folder: Path) -> Published | None:
    """Claims of one acquired folder, or None without all shifts and some J."""
    truth = json.loads((folder / "truth.json").read_text())
    protons = truth["protons"]
    if not protons or any(p.get("shift_ppm") is None for p in protons):
        return None
    if not truth.get("j_hz") and not truth.get("j_soft_hz"):
        return None
    mol = Chem.MolFromSmiles(truth["smiles"])
    owner, groups = grouped(protons, mol)
    counts = Counter(p["atom"] for p in protons)
    spins = [
        mol.GetAtomWithIdx(p["atom"]).GetTotalNumHs() if counts[p["atom"]] == 1 else 1
        for p in protons
    ]
    claims = tuple(
        Claim(
            label="+".join(protons[k]["label"] for k in members),
            atoms=tuple({protons[k]["atom"] for k in members}),
            n_protons=sum(spins[k] for k in members),
            shift_ppm=float(np.mean([protons[k]["shift_ppm"] for k in members])),
            shift_sd_ppm=0.06,
        )
        for members in groups
    )
    particles = tuple(
        Particle(claim=owner[k], nucleus="1H", n_spins=spins[k], hydrogens=(k,))
        for k in range(len(protons))
    )
    table = couplings(truth, mol, owner)
    found = ClaimSet(
        claims=claims,
        particles=particles,
        couplings=tuple(
            CouplingClaim(
                pairs=tuple(pair for pair, _ in rows),
                j_hz=float(np.mean([j for _, j in rows])),
                j_sd_hz=3.0,
                kind="published",
                bonds=3,
                is_rigid=False,
            )
            for rows, _ in table
        ),
    )
    return Published(found, np.array([trusted for _, trusted in table], dtype=bool))


def grouped(
    protons: list[dict[str, Any]], mol: Chem.Mol
) -> tuple[list[int], list[list[int]]]:
    """Protons of one published shift, and those that symmetry makes alike."""
    rank = list(Chem.CanonicalRankAtoms(mol, breakTies=False, includeChirality=False))
    groups: list[list[int]] = []
    owner = []
    for k, proton in enumerate(protons):
        for index, members in enumerate(groups):
            mean = np.mean([protons[m]["shift_ppm"] for m in members])
            gap = abs(float(mean) - proton["shift_ppm"])
            alike = any(
                rank[protons[m]["atom"]] == rank[proton["atom"]]
                and protons[m]["atom"] != proton["atom"]
                for m in members
            )
            if gap < 1e-4 or (alike and gap < 0.004):
                members.append(k)
                owner.append(index)
                break
        else:
            owner.append(len(groups))
            groups.append([k])
    return owner, groups


_Rows = list[tuple[tuple[int, int], float]]


def couplings(
    truth: dict[str, Any], mol: Chem.Mol, owner: list[int]
) -> list[tuple[_Rows, bool]]:
    """Published couplings, those that symmetry makes one together.

    On a ring couplings over as many bonds are one; in a chain those within
    0.35 Hz. Missing ones of a six-membered aromatic ring are added, untrusted.
    """
    protons = truth["protons"]
    place = {p["label"]: k for k, p in enumerate(protons)}
    distance = Chem.GetDistanceMatrix(mol)
    rings = [r for r in mol.GetRingInfo().AtomRings() if len(r) == 6]
    table: dict[tuple[object, ...], tuple[_Rows, bool]] = {}

    def add(a: int, b: int, j: float, trusted: bool) -> None:
        first, second = protons[a]["atom"], protons[b]["atom"]
        owners = tuple(sorted((owner[a], owner[b])))
        on_ring = all(mol.GetAtomWithIdx(k).GetIsAromatic() for k in (first, second))
        for key, (rows, kind) in table.items():
            near = abs(float(key[2]) - j) < 0.35 and kind == trusted
            same = on_ring and key[1] == distance[first][second]
            if key[0] == owners and (same if on_ring else near):
                rows.append(((a, b), float(key[2]) if not trusted else j))
                return
        table[owners, distance[first][second], j] = ([((a, b), j)], trusted)

    for name, trusted in (("j_hz", True), ("j_soft_hz", False)):
        for first, second, j in truth.get(name, []):
            add(place[first], place[second], j, trusted)
    known = {frozenset(pair) for rows, _ in table.values() for pair, _ in rows}
    usual = {1: 7.8, 2: 1.8, 3: 0.5}
    for a in range(len(protons)):
        for b in range(a):
            first, second = protons[a]["atom"], protons[b]["atom"]
            aromatic = any(
                first in ring
                and second in ring
                and all(mol.GetAtomWithIdx(k).GetIsAromatic() for k in ring)
                for ring in rings
            )
            if aromatic and first != second and frozenset((a, b)) not in known:
                add(b, a, usual[int(distance[first][second])], False)
    return list(table.values())


@dataclass(frozen=True)
class RealFit:
    """How one fit of an acquired spectrum ended."""

    is_from_published: bool

    shift_errors_ppm: Floats
    coupling_errors_hz: Floats
    seconds: float

    @property
    def has_succeeded(self) -> bool:
        """True if all shifts are the published ones."""
        return bool(self.shift_errors_ppm.max(initial=0.0) <= 0.004)


def real_fits(folder: Path, known: Published, n_starts: int) -> list[RealFit]:
    """Fits of one spectrum: from the published values, then from perturbed ones."""
    evidence = gather_evidence(read_acquired(folder / "raw"))
    claims = known.claims
    shifts = np.array([c.shift_ppm for c in claims.claims])
    js = np.array([c.j_hz for c in claims.couplings])
    pins: tuple[Pin, ...] = ()
    if np.abs(shifts).min() < 0.05:
        # The standard itself: its line belongs to the claim.
        pins = tuple(
            Pin(claim=c.label, low_ppm=c.shift_ppm - 0.1, high_ppm=c.shift_ppm + 0.1)
            for c in claims.claims
        )
    constraints = Constraints(pins=pins)
    prepared = prepare(evidence, constraints)
    spectrum = evidence.spectrum
    seen = np.array([prepared.is_compared[spectrum.index_of_ppm(s)] for s in shifts])
    rng = np.random.default_rng(0)
    fits = []
    for number in range(n_starts + 1):
        scale = float(number > 0)
        start = Start(
            shifts_ppm=shifts + scale * rng.uniform(-0.03, 0.03, shifts.size),
            couplings_hz=js + scale * rng.uniform(-2.0, 2.0, js.size),
        )
        perturbed = replace(
            claims,
            claims=tuple(
                replace(c, shift_ppm=float(s))
                for c, s in zip(claims.claims, start.shifts_ppm, strict=True)
            ),
            couplings=tuple(
                replace(c, j_hz=float(j))
                for c, j in zip(claims.couplings, start.couplings_hz, strict=True)
            ),
        )
        began = time.process_time()
        result = refine(
            prepared, perturbed, start, settings=FROM_AFAR, constraints=constraints
        )
        seconds = time.process_time() - began
        one = compared(result, claims, known.is_trusted, seen, seconds)
        fits.append(replace(one, is_from_published=number == 0))
    return fits


def compared(
    result: Refinement,
    claims: ClaimSet,
    is_trusted: npt.NDArray[np.bool_],
    seen: npt.NDArray[np.bool_],
    seconds: float,
) -> RealFit:
    """Errors against the published values, look-alikes in their best order."""
    shifts, js = result.shifts_ppm.copy(), result.couplings_hz.copy()
    true_shifts = np.array([c.shift_ppm for c in claims.claims])
    true_js = np.array([c.j_hz for c in claims.couplings])
    for pair in [*like_pairs(claims, frozenset())] * 2:
        a, b = pair.first, pair.second
        now = abs(shifts[a] - true_shifts[a]) + abs(shifts[b] - true_shifts[b])
        turned = abs(shifts[b] - true_shifts[a]) + abs(shifts[a] - true_shifts[b])
        if turned < now - 1e-6:
            shifts[[a, b]] = shifts[[b, a]]
            for first, second in pair.couplings:
                js[[first, second]] = js[[second, first]]
    counted = is_trusted & result.determined
    errors = (shifts - true_shifts)[seen]
    if errors.size >= 5:
        errors -= np.median(errors)
    return RealFit(
        False,
        np.abs(errors),
        np.abs(np.abs(js) - np.abs(true_js))[counted],
        seconds,
    )


def one_made(claims: ClaimSet, snr: float, rng: np.random.Generator) -> Evidence:
    """One made spectrum with noise."""
    return made_evidence(
        claims, snr=snr, rng=rng, step_hz=STEP_HZ, gauss_share=GAUSS_SHARE
    )


def made_figures(n_draws: int, names: list[str]) -> dict[str, float]:
    """Scatter and bias of J over the Cramer-Rao bound, and coverage.

    An ideal linear fit of the same noise is the measure: its scatter over the
    draws stands for the bound and its mean error is taken off the bias, so that
    200 draws tell both to about one per cent of the bound.
    """
    ratios: list[float] = []
    inside: list[bool] = []
    biases: list[float] = []
    for claims in (MADE[name] for name in names):
        shifts = np.array([c.shift_ppm for c in claims.claims])
        js = np.array([c.j_hz for c in claims.couplings])
        start = Start(shifts_ppm=shifts, couplings_hz=js)
        estimator = efficient_estimator(claims, STEP_HZ, GAUSS_SHARE)
        clean = one_made(claims, 1e12, np.random.default_rng(0))
        for snr in (20, 100, 500):
            rng = np.random.default_rng(snr)
            found, ideal = [], []
            for _ in range(n_draws):
                evidence = one_made(claims, snr, rng)
                noise = evidence.spectrum.intensities - clean.spectrum.intensities
                settings = RefineSettings(second_thoughts=0)
                result = refine(evidence, claims, start, settings=settings)
                found.append(result.couplings_hz - js)
                ideal.append(estimator @ noise)
                inside += (np.abs(found[-1]) < 1.96 * result.coupling_sds_hz).tolist()
            bound = crb_sds(claims, snr, STEP_HZ, GAUSS_SHARE)
            ratios += (np.std(found, axis=0) / np.std(ideal, axis=0)).tolist()
            gap = np.mean(found, axis=0) - np.mean(ideal, axis=0)
            biases += (np.abs(gap) / bound).tolist()
    return {
        "crb_ratio_min": min(ratios),
        "crb_ratio_max": max(ratios),
        "bias_over_crb_max": max(biases),
        "coverage_95": float(np.mean(inside)),
        "made_intervals": len(inside),
    }


def real_figures(fits: dict[str, list[RealFit]]) -> dict[str, Any]:
    """Success over all perturbed starts, and errors of the fits that succeeded."""
    tried = {
        name: [fit for fit in here if not fit.is_from_published]
        for name, here in fits.items()
    }
    every = [fit for here in tried.values() for fit in here]
    good = [fit for fit in every if fit.has_succeeded]
    contradicted = [name for name, here in fits.items() if not here[0].has_succeeded]
    agreed = [
        fit for name, here in tried.items() if name not in contradicted for fit in here
    ]
    js = np.concatenate([fit.coupling_errors_hz for fit in good])
    shifts = np.concatenate([fit.shift_errors_ppm for fit in good])
    return {
        "real_fits": len(every),
        "real_success": len(good) / len(every),
        "real_failed": {
            name: sum(not fit.has_succeeded for fit in here)
            for name, here in tried.items()
            if not all(fit.has_succeeded for fit in here)
        },
        "real_contradicted": contradicted,
        "real_success_without": float(np.mean([f.has_succeeded for f in agreed])),
        "real_shift_median_ppm": float(np.median(shifts)),
        "real_j_median_hz": float(np.median(js)),
        "real_j_p90_hz": float(np.quantile(js, 0.9)),
        "real_seconds_median": float(np.median([fit.seconds for fit in every])),
    }


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("names", nargs="*")
    parser.add_argument("--draws", type=int, default=200)
    parser.add_argument("--made", nargs="*", choices=list(MADE), default=list(MADE))
    parser.add_argument("--starts", type=int, default=5)
    options = parser.parse_args()
    figures: dict[str, Any] = {}
    if options.draws:
        figures |= made_figures(options.draws, options.made)
    fits: dict[str, list[RealFit]] = {}
    for folder in sorted((SHARED / "acquired").glob("br*")):
        wanted = not options.names or folder.name in options.names
        if not wanted or folder.name in LEFT_OUT:
            continue
        known = published(folder) if (folder / "truth.json").exists() else None
        if known is not None and options.starts:
            fits[folder.name] = real_fits(folder, known, options.starts)
    if fits:
        figures |= real_figures(fits)
    print(json.dumps(figures))


if __name__ == "__main__":
    main()
