"""Synthetic evidence for the reconcile tests: first-order Lorentzian multiplets."""

from collections.abc import Callable, Sequence

import numpy as np
import pytest

from spinledger.values.acquisition import Metadata
from spinledger.values.claim import Claim, ClaimSet, CouplingClaim, Particle
from spinledger.values.evidence import Evidence, ProcessingQuality, Stray
from spinledger.values.recipe import Recipe, Reference
from spinledger.values.spectrum import Spectrum

FREQUENCY_MHZ = 400.0


def _sticks(splits: Sequence[tuple[int, float]]) -> list[tuple[float, float]]:
    lines = [(0.0, 1.0)]
    for n_spins, j_hz in splits:
        for _ in range(n_spins):
            lines = [
                (f + s * j_hz / 2, share / 2) for f, share in lines for s in (-1, 1)
            ]
    return lines


@pytest.fixture
def make_evidence() -> Callable[..., Evidence]:
    """Evidence from (shift ppm, protons, splits) multiplets and a noise sd."""

    def build(
        multiplets: Sequence[tuple[float, float, Sequence[tuple[int, float]]]],
        *,
        width_hz: float = 1.2,
        noise: float = 0.002,
        strays: tuple[Stray, ...] = (),
        reference_sd_ppm: float = 0.002,
        seed: int = 3,
    ) -> Evidence:
        n_points = 16384
        width_ppm = 14.0
        shifts = 12.0 - width_ppm / n_points * np.arange(n_points)
        hwhm = width_hz / 2
        y = np.zeros(n_points)
        for centre, protons, splits in multiplets:
            for offset, share in _sticks(splits):
                gap = (shifts - centre) * FREQUENCY_MHZ - offset
                y += protons * share * hwhm / np.pi / (gap**2 + hwhm**2)
        y += noise * np.random.default_rng(seed).standard_normal(n_points)
        return Evidence(
            metadata=Metadata(
                source_name="synthetic",
                sha256="0" * 64,
                format_name="synthetic",
                nucleus="1H",
                spectrometer_frequency_mhz=FREQUENCY_MHZ,
            ),
            recipe=Recipe(steps=()),
            reference=Reference(offset_ppm=0.0, by="TMS", sd_ppm=reference_sd_ppm),
            spectrum=Spectrum(
                intensities=y,
                first_point_ppm=12.0,
                spectral_width_hz=width_ppm * FREQUENCY_MHZ,
                spectrometer_frequency_mhz=FREQUENCY_MHZ,
            ),
            noise_sd=noise,
            solvent="CDCl3",
            solvent_seen=None,
            solvent_header=None,
            signals=(),
            strays=strays,
            quality=ProcessingQuality(phase_sd_deg=0.5, baseline_sd=1.0),
        )

    return build


@pytest.fixture
def make_claims() -> Callable[..., ClaimSet]:
    """Claims from (label, shift, sd, protons) rows and (a, b, J) couplings."""

    def build(
        rows: Sequence[tuple[str, float, float, int]],
        couplings: Sequence[tuple[int, int, float]] = (),
        *,
        optional: frozenset[str] = frozenset(),
        silent: frozenset[str] = frozenset(),
    ) -> ClaimSet:
        claims = tuple(
            Claim(
                label=label,
                atoms=(i,),
                n_protons=n,
                shift_ppm=shift,
                shift_sd_ppm=sd,
                visibility="silent"
                if label in silent
                else "optional"
                if label in optional
                else "seen",
                is_exchangeable=label in optional or label in silent,
            )
            for i, (label, shift, sd, n) in enumerate(rows)
        )
        seen = [i for i, c in enumerate(claims) if c.visibility != "silent"]
        particles = tuple(
            Particle(
                claim=i, nucleus="1H", n_spins=claims[i].n_protons, hydrogens=(100 + i,)
            )
            for i in seen
        )
        where = {i: k for k, i in enumerate(seen)}
        return ClaimSet(
            claims=claims,
            particles=particles,
            couplings=tuple(
                CouplingClaim(
                    pairs=((where[a], where[b]),),
                    j_hz=j,
                    j_sd_hz=1.0,
                    kind="vicinal chain",
                    bonds=3,
                    is_rigid=False,
                )
                for a, b, j in couplings
            ),
        )

    return build
