"""Field change, homodecoupling and satellites against closed forms."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from core.spins.spin_cases import claim_set
from spinledger.spins.experiments import lines_at_field
from spinledger.spins.network import ClaimLineSet, ClaimNetwork
from spinledger.values.claim import Claim, ClaimSet, CouplingClaim, Particle

Floats = npt.NDArray[np.float64]

AMX = claim_set(
    [("A", [1], 3.00), ("M", [1], 2.94), ("X", [1], 5.0)],
    [([(0, 1)], -12.0), ([(0, 2)], 8.0), ([(1, 2)], 4.0)],
)
SHIFTS = np.array([3.00, 2.94, 5.0])
COUPLINGS = np.array([-12.0, 8.0, 4.0])


def ab_quartet(centre: float, gap: float, j: float) -> tuple[Floats, Floats]:
    """Lines of AB in closed form, by rising frequency, one proton each."""
    distance = np.hypot(gap, j)
    places = [-distance - abs(j), -distance + abs(j)]
    places += [distance - abs(j), distance + abs(j)]
    weights = 0.5 * (1 + np.array([-1, 1, 1, -1]) * abs(j) / distance)
    return centre + 0.5 * np.array(places), weights


def total(lines: ClaimLineSet) -> tuple[Floats, Floats]:
    """The spectrum whoever it belongs to: coinciding lines added up."""
    kept = np.abs(lines.protons) > 1e-9
    frequencies, protons = lines.frequencies_hz[kept], lines.protons[kept]
    order = np.argsort(frequencies)
    frequencies, protons = frequencies[order], protons[order]
    starts = np.flatnonzero(np.diff(frequencies, prepend=-np.inf) > 0.05)
    return frequencies[starts], np.add.reduceat(protons, starts)


@pytest.mark.parametrize("frequency_mhz", [60.0, 400.0, 900.0])
def test_irradiating_x_of_an_abx_system_leaves_an_ab_quartet(
    frequency_mhz: float,
) -> None:
    lines = lines_at_field(
        ClaimNetwork(AMX),
        SHIFTS,
        COUPLINGS,
        frequency_mhz=frequency_mhz,
        irradiated=frozenset({2}),
    )
    assert 2 not in lines.claim
    expected = ab_quartet(2.97 * frequency_mhz, 0.06 * frequency_mhz, 12.0)
    frequencies, protons = total(lines)
    # Lines are merged within 0.02 Hz; those under 1e-5 of a claim are dropped.
    np.testing.assert_allclose(frequencies, expected[0], atol=0.02)
    np.testing.assert_allclose(protons, expected[1], atol=1e-4)


def test_field_moves_shifts_and_leaves_couplings() -> None:
    network = ClaimNetwork(AMX)
    spans = []
    for frequency_mhz in (400.0, 800.0):
        lines = lines_at_field(network, SHIFTS, COUPLINGS, frequency_mhz=frequency_mhz)
        own = lines.claim == 2
        centre = lines.protons[own] @ lines.frequencies_hz[own]
        # First moment of a claim: its shift, whatever it couples to.
        assert centre == pytest.approx(5.0 * frequency_mhz, abs=0.02)
        strong = lines.frequencies_hz[own & (lines.protons > 0.1)]
        spans.append(float(np.ptp(strong)))
    # Outer lines of X are J_AX + J_BX apart at any field.
    np.testing.assert_allclose(spans, 12.0, atol=0.04)


def satellites(j_ch: float, j_hh: float) -> ClaimSet:
    """Two protons of one shift on neighbouring carbons, one of them 13C."""
    claim = Claim(
        label="CH", atoms=(0, 1), n_protons=2, shift_ppm=6.5, shift_sd_ppm=0.1
    )
    proton = [
        Particle(claim=0, nucleus="1H", n_spins=1, hydrogens=(k,)) for k in (0, 1)
    ]
    carbon = Particle(claim=None, nucleus="13C", n_spins=1, hydrogens=())
    return ClaimSet(
        claims=(claim,),
        particles=(*proton, carbon),
        couplings=tuple(
            CouplingClaim(
                pairs=(pair,), j_hz=j, j_sd_hz=1.0, kind="x", bonds=3, is_rigid=True
            )
            for pair, j in (((0, 2), j_ch), ((0, 1), j_hh))
        ),
    )


def test_carbon_13_breaks_equivalence_and_its_satellites_show_the_hidden_j() -> None:
    """One AB quartet for each state of the carbon, its gap half of 1J(CH).

    The proton on 13C stands 1J/2 off the shift, its twin on 12C at the shift.
    """
    j_ch, j_hh = 167.0, 12.0
    lines = lines_at_field(
        ClaimNetwork(satellites(j_ch, j_hh)),
        np.array([6.5]),
        np.array([j_ch, j_hh]),
        frequency_mhz=400.0,
    )
    quartets = [
        ab_quartet(2600.0 + side * j_ch / 4, j_ch / 2, j_hh) for side in (-1, 1)
    ]
    places = np.concatenate([places for places, _ in quartets])
    weights = 0.5 * np.concatenate([weights for _, weights in quartets])
    order = np.argsort(places)
    frequencies, protons = total(lines)
    # Merging within 0.02 Hz and the dropping of the weakest, as above.
    np.testing.assert_allclose(frequencies, places[order], atol=0.02)
    np.testing.assert_allclose(protons, weights[order], atol=1e-4)
