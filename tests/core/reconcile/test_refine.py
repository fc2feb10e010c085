"""Refinement against spectra whose answer is known."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import pytest

from core.reconcile.refine_cases import made_evidence
from core.spins.spin_cases import claim_set
from spinledger.errors import CancelledError
from spinledger.reconcile.options import Constraints, FixedCoupling, Pin
from spinledger.reconcile.refine import (
    FROM_AFAR,
    QUICK,
    Refinement,
    RefineSettings,
    Start,
    refine,
)
from spinledger.values.claim import ClaimSet
from spinledger.values.evidence import Stray

Floats = npt.NDArray[np.float64]

AMX = claim_set(
    [("2-H", [1], 4.0), ("3-HA", [1], 3.2), ("3-HB", [1], 2.95)],
    [([(0, 1)], 7.0), ([(0, 2)], 5.0), ([(1, 2)], -14.0)],
)
ABX = claim_set(
    [("2-H", [1], 4.0), ("3-HA", [1], 2.95), ("3-HB", [1], 2.90)],
    [([(0, 1)], 8.0), ([(0, 2)], 4.0), ([(1, 2)], -14.0)],
)
RING = claim_set(
    [("2-H", [1, 1], 7.30), ("3-H", [1, 1], 6.90)],
    [
        ([(0, 2), (1, 3)], 8.4),
        ([(0, 3), (1, 2)], 0.4),
        ([(0, 1)], 2.3),
        ([(2, 3)], 2.8),
    ],
)


def answer(claims: ClaimSet) -> tuple[Floats, Floats]:
    return (
        np.array([claim.shift_ppm for claim in claims.claims]),
        np.array([coupling.j_hz for coupling in claims.couplings]),
    )


def start_from(claims: ClaimSet, shift_ppm: float, j_hz: float, seed: int) -> Start:
    rng = np.random.default_rng(seed)
    shifts, couplings = answer(claims)
    return Start(
        shifts_ppm=shifts + rng.uniform(-shift_ppm, shift_ppm, shifts.size),
        couplings_hz=couplings + rng.uniform(-j_hz, j_hz, couplings.size),
    )


@pytest.mark.parametrize(
    ("claims", "j_hz"),
    [(AMX, 2.0), (ABX, 2.0), (RING, 0.3)],
    ids=["AMX", "ABX", "RING"],
)
def test_refine_finds_the_parameters_from_afar(claims: ClaimSet, j_hz: float) -> None:
    evidence = made_evidence(claims, snr=300, rng=np.random.default_rng(1))
    result = refine(
        evidence, claims, start_from(claims, 0.03, j_hz, 2), settings=FROM_AFAR
    )
    shifts, couplings = answer(claims)
    # Five of the reported sds, which test_interval_covers checks by themselves.
    assert np.all(np.abs(result.shifts_ppm - shifts) < 5 * result.shift_sds_ppm)
    assert np.all(np.abs(result.couplings_hz - couplings) < 5 * result.coupling_sds_hz)
    assert np.all(result.coupling_sds_hz < 0.05)
    assert result.determined.all()
    np.testing.assert_allclose(result.widths_hz, 1.0, rtol=0.05)
    np.testing.assert_allclose(
        result.protons, [c.n_protons for c in claims.claims], rtol=0.02
    )
    assert result.residuals.boxcar_share < 0.01
    assert result.reason == ""


def test_model_has_the_measured_area_and_scale() -> None:
    evidence = made_evidence(AMX, snr=300, rng=np.random.default_rng(1))
    result = refine(evidence, AMX, start_from(AMX, 0.005, 0.5, 3))
    # Lorentz tails beyond the stretch that is drawn are 0.3 % of the area.
    assert result.area_per_proton == pytest.approx(7.3e6, rel=0.01)
    area = result.intensities.sum() * evidence.spectrum.step_hz
    assert area == pytest.approx(3 * 7.3e6, rel=0.02)
    assert [one.claim for one in result.claim_lines] == ["2-H", "3-HA", "3-HB"]


def crb_sds(
    claims: ClaimSet, snr: float, step_hz: float, gauss_share: float = 0.0
) -> Floats:
    """Cramer-Rao bound of every J: all other parameters free, white noise."""
    estimator = efficient_estimator(claims, step_hz, gauss_share)
    rng = np.random.default_rng(0)
    clean = made_evidence(
        claims, snr=1e12, rng=rng, step_hz=step_hz, gauss_share=gauss_share
    )
    noise_sd = float(clean.spectrum.intensities.max()) / snr
    return np.asarray(noise_sd * np.sqrt((estimator**2).sum(axis=1)))


def efficient_estimator(
    claims: ClaimSet, step_hz: float, gauss_share: float = 0.0
) -> Floats:
    """Rows that turn the noise of a made spectrum into the errors of an ideal fit.

    Every claim has its own width and area in both, and all have a common Gauss
    share. Independent of the fit: the
    model is summed line by line, its derivatives are central differences, and no
    prior is put in.

    Returns
    -------
    numpy.ndarray, shape (n_couplings, n_points), Hz over intensity
    """
    rng = np.random.default_rng(0)
    clean = made_evidence(
        claims, snr=1e12, rng=rng, step_hz=step_hz, gauss_share=gauss_share
    )
    shifts, couplings = answer(claims)
    point = np.concatenate(
        [shifts * 500.0, couplings, np.zeros(2 * shifts.size), [gauss_share]]
    )

    def model(values: Floats) -> Floats:
        n = shifts.size
        moved = claim_set(
            [
                (c.label, [1] * c.n_protons, values[k] / 500.0)
                for k, c in enumerate(claims.claims)
            ],
            [(list(c.pairs), values[n + k]) for k, c in enumerate(claims.couplings)],
        )
        made = made_evidence(
            moved,
            snr=1e12,
            rng=rng,
            step_hz=step_hz,
            width_ratios=np.exp(values[-2 * n - 1 : -n - 1]),
            areas=1.0 + values[-n - 1 : -1],
            gauss_share=float(values[-1]),
        )
        # The axis follows the shifts: put both on the first one.
        spectrum = made.spectrum
        return np.interp(
            clean.spectrum.shifts_ppm[::-1],
            spectrum.shifts_ppm[::-1],
            spectrum.intensities[::-1],
        )

    columns = []
    for k in range(point.size):
        step = np.zeros(point.size)
        step[k] = 1e-3
        columns.append((model(point + step) - model(point - step)) / 2e-3)
    jacobian = np.array(columns).T
    # The model was read off at rising shifts; spectra fall.
    rows = np.linalg.pinv(jacobian)[:, ::-1]
    n = shifts.size
    return np.asarray(rows[n : n + couplings.size])


def test_scatter_of_j_is_the_cramer_rao_bound_and_intervals_cover() -> None:
    rng = np.random.default_rng(12)
    n_draws = 24
    shifts, couplings = answer(AMX)
    found, z = [], []
    for _ in range(n_draws):
        evidence = made_evidence(AMX, snr=50, rng=rng)
        result = refine(
            evidence,
            AMX,
            Start(shifts_ppm=shifts, couplings_hz=couplings),
            settings=RefineSettings(second_thoughts=0),
        )
        found.append(result.couplings_hz)
        z.append((result.couplings_hz - couplings) / result.coupling_sds_hz)
    bound = crb_sds(AMX, 50, 0.2)
    ratio = np.std(found, axis=0) / bound
    # 24 draws give a scatter to 15 %: three of that either side.
    assert np.all(ratio > 0.55)
    assert np.all(ratio < 1.5)
    # Four standard errors of a mean of 24 draws.
    error = np.abs(np.mean(found, axis=0) - couplings)
    assert np.all(error < 4 * bound / np.sqrt(n_draws))
    inside = np.mean(np.abs(z) < 1.96)
    # 72 numbers, 95 %: three standard errors of 2.6 %.
    assert 0.87 <= inside <= 1.0


def test_coupling_that_the_data_do_not_show_is_undetermined() -> None:
    # CH2-CH2 with J = J': only their sum moves lines.
    claims = claim_set(
        [("1-H", [1, 1], 3.2), ("2-H", [1, 1], 2.2)],
        [
            ([(0, 2), (1, 3)], 7.0),
            ([(0, 3), (1, 2)], 7.0),
            ([(0, 1)], -13.0),
            ([(2, 3)], -13.0),
        ],
    )
    evidence = made_evidence(claims, snr=100, rng=np.random.default_rng(5))
    shifts, couplings = answer(claims)
    result = refine(evidence, claims, Start(shifts_ppm=shifts, couplings_hz=couplings))
    assert not result.determined.any()
    (known,) = result.known_sums
    assert (known.first, known.second) == (0, 1)
    assert known.sum_hz == pytest.approx(14.0, abs=5 * known.sd_hz)
    assert known.sd_hz < 0.1


def test_masked_stretch_is_not_compared_and_its_claim_keeps_its_prior() -> None:
    water = Stray(low_ppm=3.85, high_ppm=4.15, kind="water", why="")
    evidence = made_evidence(
        AMX, snr=300, rng=np.random.default_rng(6), strays=(water,)
    )
    result = refine(evidence, AMX, start_from(AMX, 0.004, 0.5, 7))
    # Of 2-H little is known but its prediction, 0.2 ppm sd: the roof of its
    # partners tells only roughly how far away it is.
    assert 0.05 < result.shift_sds_ppm[0] <= 0.2
    assert result.shift_sds_ppm[1] < 1e-3
    # Its couplings still show in its partners.
    assert result.determined.all()


def test_absent_claim_has_no_lines_and_nan_width() -> None:
    evidence = made_evidence(AMX, snr=300, rng=np.random.default_rng(8))
    shifts, couplings = answer(AMX)
    start = Start(shifts_ppm=shifts, couplings_hz=couplings, absent=frozenset({0}))
    result = refine(evidence, AMX, start)
    assert np.isnan(result.widths_hz[0])
    assert [one.claim for one in result.claim_lines] == ["3-HA", "3-HB"]
    # A third of the spectrum has no owner; the local baseline under it, with a
    # prior of a tenth of its height, takes up some of the tails.
    assert result.residuals.unexplained_share == pytest.approx(1 / 3, abs=0.1)


def test_constraints_hold_a_coupling_and_a_pinned_claim() -> None:
    evidence = made_evidence(AMX, snr=300, rng=np.random.default_rng(9))
    constraints = Constraints(
        pins=(Pin(claim="3-HB", low_ppm=2.952, high_ppm=2.97),),
        fixed_couplings=(FixedCoupling(claim="2-H", partner="3-HA", j_hz=6.5),),
    )
    result = refine(
        evidence, AMX, start_from(AMX, 0.002, 0.2, 10), constraints=constraints
    )
    assert result.couplings_hz[0] == 6.5
    assert np.isnan(result.coupling_sds_hz[0])
    assert 2.952 <= result.shifts_ppm[2] <= 2.97


def test_claims_put_in_each_others_place_find_home() -> None:
    claims = claim_set(
        [("a", [1], 7.36), ("b", [1], 7.30), ("c", [1], 6.2)],
        [([(0, 2)], 15.0), ([(1, 2)], 2.0)],
    )
    evidence = made_evidence(claims, snr=300, rng=np.random.default_rng(13))
    shifts, couplings = answer(claims)
    start = Start(shifts_ppm=shifts[[1, 0, 2]], couplings_hz=couplings)
    result = refine(evidence, claims, start)
    np.testing.assert_allclose(result.shifts_ppm, shifts, atol=1e-3)


def test_quick_mode_is_coarse_but_close() -> None:
    evidence = made_evidence(ABX, snr=300, rng=np.random.default_rng(14))
    result = refine(evidence, ABX, start_from(ABX, 0.01, 1.0, 15), settings=QUICK)
    assert result.n_evaluations < 30
    np.testing.assert_allclose(result.shifts_ppm, answer(ABX)[0], atol=0.003)


def test_worse_structure_scores_worse() -> None:
    evidence = made_evidence(AMX, snr=300, rng=np.random.default_rng(16))
    wrong = claim_set([("2-H", [1], 4.0), ("3-H", [2], 3.08)], [([(0, 1)], 7.0)])
    right = refine(evidence, AMX, start_from(AMX, 0.005, 0.5, 17))
    other = refine(evidence, wrong, start_from(wrong, 0.005, 0.5, 17))
    assert right.score + 5.0 < other.score
    assert right.log_evidence > other.log_evidence


def test_cancelling_stops_the_fit() -> None:
    evidence = made_evidence(AMX, snr=300, rng=np.random.default_rng(18))
    with pytest.raises(CancelledError, match="stopped"):
        refine(evidence, AMX, start_from(AMX, 0.01, 1.0, 19), cancelled=lambda: True)


def test_progress_is_told_in_words_and_rises() -> None:
    evidence = made_evidence(AMX, snr=300, rng=np.random.default_rng(20))
    told: list[tuple[str, float]] = []
    refine(
        evidence,
        AMX,
        start_from(AMX, 0.005, 0.5, 21),
        progress=lambda words, share: told.append((words, share)),
    )
    shares = [share for _, share in told]
    assert shares == sorted(shares)
    assert told[0][0] == "refining at 6 Hz"


def test_same_input_gives_the_same_numbers() -> None:
    evidence = made_evidence(ABX, snr=100, rng=np.random.default_rng(22))
    first, second = (
        refine(evidence, ABX, start_from(ABX, 0.01, 1.0, 23)) for _ in range(2)
    )
    assert first.couplings_hz.tolist() == second.couplings_hz.tolist()
    assert first.score == second.score


def correlation(result: Refinement, first: str, second: str) -> float:
    names = result.parameter_names
    a, b = (
        next(k for k, name in enumerate(names) if name.startswith(f"J {start}"))
        for start in (first, second)
    )
    covariance = result.covariance
    return float(covariance[a, b] / np.sqrt(covariance[a, a] * covariance[b, b]))


def test_strongly_coupled_couplings_are_correlated() -> None:
    close = claim_set(
        [("2-H", [1], 4.0), ("3-HA", [1], 2.91), ("3-HB", [1], 2.90)],
        [([(0, 1)], 8.0), ([(0, 2)], 4.0), ([(1, 2)], -14.0)],
    )
    evidence = made_evidence(close, snr=100, rng=np.random.default_rng(24))
    shifts, couplings = answer(close)
    result = refine(evidence, close, Start(shifts_ppm=shifts, couplings_hz=couplings))
    # The X part gives J_AX + J_BX well and their difference badly.
    assert correlation(result, "2-H, 3-HA", "2-H, 3-HB") < -0.3
