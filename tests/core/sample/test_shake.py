from dataclasses import replace

import numpy as np
import pytest

import make_samples
from shake_cases import FIELD_MHZ, draw_pair, evidence_of_lines, multiplet, plot_of
from spinledger.detection.evidence import gather_evidence
from spinledger.errors import EvidenceError
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.sample.align import align
from spinledger.sample.exchanged import exchanged_areas
from spinledger.sample.shake import shake_pair
from spinledger.structure.read import read_structure
from spinledger.values.acquisition import Fid, Metadata
from spinledger.values.evidence import Evidence

N_DRAWS = 12


def test_fractions_of_synthetic_pairs_lie_within_their_sd() -> None:
    z = []
    for seed in range(1000, 1000 + N_DRAWS):
        pair = draw_pair(np.random.default_rng(seed))
        found = exchanged_areas(pair.before, pair.after, pair.plots, waters=pair.waters)
        for one in found.fractions:
            assert one.fraction is not None
            assert one.sd is not None
            z.append((one.fraction - pair.fractions[one.claims[0]]) / one.sd)
    # 24 fractions: at 95 % coverage, fewer than 20 inside has a chance of 0.6 %.
    assert np.sum(np.abs(z) < 2.0) >= 20
    assert np.max(np.abs(z)) < 4.0


def test_scale_of_a_pair_is_that_of_the_receiver_gain() -> None:
    rng = np.random.default_rng(5)
    lines = [
        line
        for shift, protons in ((1.2, 3.0), (2.4, 2.0), (7.3, 5.0))
        for line in multiplet(shift, protons, [7.0], 1.0)
    ]
    one = evidence_of_lines(lines, rng, noise=0.005)
    moved = [(at + 0.02, area, 1.0) for at, area, _ in lines]
    two = evidence_of_lines(moved, rng, noise=0.005, receiver_gain=2.0)
    found = align(one, two, [(1.15, 1.25), (2.35, 2.45), (7.25, 7.35)])
    # 0.005: three signals at a signal-to-noise of several hundred.
    assert found.scale == pytest.approx(0.5, rel=0.005)
    # A tenth of a line width of 0.0025 ppm.
    assert found.offset_ppm == pytest.approx(-0.02, abs=2.5e-4)


def test_proton_that_must_stay_and_went_is_said() -> None:
    rng = np.random.default_rng(6)
    places = ((0.9, 3.0), (1.6, 2.0), (2.2, 2.0), (3.3, 3.0), (7.0, 1.0))
    before = [line for at, n in places for line in multiplet(at, n, [], 1.0)]
    after = before[:-1]
    plots = [plot_of(f"C{k}", n, at, [], 1.0, may_exchange=False)
             for k, (at, n) in enumerate(places)]  # fmt: skip
    found = exchanged_areas(
        evidence_of_lines(before, rng, noise=0.01),
        evidence_of_lines(after, rng, noise=0.01),
        plots,
    )
    (loss,) = found.losses
    assert loss.claims == ("C4",)
    assert loss.fraction == pytest.approx(1.0, abs=4.0 * loss.sd)


def test_water_on_the_exchangeable_withholds_the_fraction() -> None:
    rng = np.random.default_rng(7)
    lines = [line for at in (0.9, 2.2, 7.0) for line in multiplet(at, 3.0, [], 1.0)]
    before = [*lines, (4.7, 1.0, 4.0)]
    after = [*lines, (4.72, 3.0, 4.0)]
    plots = [plot_of(f"C{at}", 3.0, at, [], 1.0, may_exchange=False)
             for at in (0.9, 2.2, 7.0)]  # fmt: skip
    plots.append(plot_of("OH", 1.0, 4.7, [], 4.0, may_exchange=True))
    found = exchanged_areas(
        evidence_of_lines(before, rng, noise=0.01),
        evidence_of_lines(after, rng, noise=0.01),
        plots,
        waters=((4.69, 4.75),),
    )
    (one,) = found.fractions
    assert one.fraction is None
    assert "Water lies on OH" in one.why


@pytest.fixture(scope="module")
def in_dmso() -> tuple[make_samples.Sample, make_samples.Sample]:
    """Propan-2-ol in DMSO, its OH a doublet of 5 Hz, and without its OH."""
    sample = next(one for one in make_samples.SAMPLES if one.name == "batch-117")
    group, singlet = make_samples.Group, make_samples.Singlet
    carbons = (
        group(label="1", n_spins=6, shift_ppm=1.035),
        group(label="2", n_spins=1, shift_ppm=3.775),
    )
    whole = replace(
        sample,
        solvent="DMSO-d6",
        groups=(*carbons, group(label="OH", n_spins=1, shift_ppm=4.30, width_hz=1.4)),
        couplings_hz={("1", "2"): 6.1, ("2", "OH"): 5.0},
        singlets=(singlet(shift_ppm=0.0, protons=0.9),),
    )
    gone = replace(
        whole,
        groups=carbons,
        couplings_hz={("1", "2"): 6.1},
        singlets=(*whole.singlets, singlet(shift_ppm=3.33, protons=2.0)),
    )
    return whole, gone


def _evidence(
    shares: list[tuple[make_samples.Sample, float]], name: str, seed: int
) -> Evidence:
    lines = [
        (at, area * share, width)
        for sample, share in shares
        for at, area, width in make_samples.sample_lines(sample)
    ]
    samples = make_samples.fid_of(lines, replace(shares[0][0], seed=seed))
    metadata = Metadata(
        source_name=name, sha256="0" * 64, format_name="synthetic", nucleus="1H",
        spectrometer_frequency_mhz=make_samples.FIELD_MHZ, solvent="DMSO-d6",
    )  # fmt: skip
    fid = Fid(
        metadata=metadata,
        samples=samples,
        spectral_width_hz=make_samples.WIDTH_HZ,
        carrier_ppm=make_samples.CARRIER_PPM,
        group_delay_points=make_samples.GROUP_DELAY_POINTS,
    )
    return gather_evidence(fid)


def test_partly_exchanged_oh_collapses_its_coupling_by_the_same_share(
    in_dmso: tuple[make_samples.Sample, make_samples.Sample],
) -> None:
    whole, gone = in_dmso
    before = _evidence([(whole, 1.0)], "tube", 21)
    after = _evidence([(whole, 0.4), (gone, 0.6)], "tube shaken", 22)
    ledger = reconcile(
        before,
        read_structure("CC(C)O"),
        options=ReconcileOptions(quick=True),
    )
    shake = shake_pair(ledger, after)
    (oh,) = shake.fractions
    assert len(oh.claims) == 1
    assert oh.fraction is not None
    assert oh.sd is not None
    assert oh.fraction == pytest.approx(0.6, abs=3.0 * oh.sd)
    (collapse,) = shake.collapses
    assert collapse.claim == oh.claims[0]
    assert collapse.fraction == pytest.approx(0.6, abs=3.0 * collapse.sd)
    assert any("as its loss asks for" in one for one in shake.sentences())
    assert any(one.is_water for one in shake.gains)
    assert not shake.contradicts


def test_spectrum_of_another_compound_is_refused_in_a_sentence() -> None:
    rng = np.random.default_rng(8)
    one = evidence_of_lines(multiplet(1.2, 3.0, [7.0, 5.0], 1.0), rng, noise=0.01)
    two = evidence_of_lines(multiplet(8.2, 3.0, [7.0], 1.0), rng, noise=0.01)
    with pytest.raises(EvidenceError, match="no signal in common"):
        align(one, two, [(1.1, 1.3)])


def test_axis_that_runs_the_other_way_is_said() -> None:
    rng = np.random.default_rng(9)
    lines = [
        line
        for at, n, js in ((0.9, 3.0, [7.0, 7.0]), (2.6, 1.0, [15.0]), (7.2, 2.0, []))
        for line in multiplet(at, n, js, 1.0)
    ]
    one = evidence_of_lines(lines, rng, noise=0.002)
    turned = replace(
        one.spectrum,
        intensities=one.spectrum.intensities[::-1],
    )
    two = replace(one, spectrum=turned)
    windows = [(at - 20 / FIELD_MHZ, at + 20 / FIELD_MHZ) for at in (0.9, 2.6, 7.2)]
    with pytest.raises(EvidenceError, match="runs the other way"):
        align(one, two, windows)
