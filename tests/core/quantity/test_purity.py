"""Content by internal standard: known areas come out, unfit spectra are refused."""

import math
from dataclasses import replace

import pytest

from quantity_weighed import ACETONE_PPM, STANDARD_PPM, STANDARD_PROTONS, weighed_ledger
from spinledger.quantity.conditions import PulseConditions, allowance, saturation
from spinledger.quantity.content import content
from spinledger.quantity.integrals import claim_areas
from spinledger.quantity.purity import InternalStandard, Weighings, purity

STANDARD = InternalStandard(
    name="1,3,5-trimethoxybenzene",
    molar_mass=168.19,
    n_protons=STANDARD_PROTONS,
    shift_ppm=STANDARD_PPM,
    purity=0.998,
    purity_u=0.001,
)
# The ester is 132.16 g/mol. Half a molecule of standard for each of ester, 5.000 mg
# of it: 5.000 * 0.998 / 168.19 / 0.5 * 132.16 = 7.8422 mg of ester in 8.000 mg.
WEIGHED = Weighings(sample_mg=8.0, standard_mg=5.0, u_mg=0.01)
EXPECTED = 5.0 * 0.998 / 168.19 / 0.5 * 132.16 / 8.0


def test_known_areas_give_the_content_done_by_hand() -> None:
    found = purity(weighed_ledger(), STANDARD, WEIGHED)
    assert found.refusals == ()
    assert found.budget is not None
    # Noise, and tails of neighbours under the integrals, stay under half a percent.
    assert found.budget.value == pytest.approx(EXPECTED, rel=5e-3)
    assert abs(found.budget.value - EXPECTED) < found.budget.expanded
    assert 0.002 < found.budget.standard_uncertainty / found.budget.value < 0.02
    names = [row.source.name for row in found.budget.rows]
    assert len(names) == len(set(names)) == 10
    assert "5 s is assumed" in found.notes[0]


def test_signals_that_do_not_serve_are_named() -> None:
    used, left = claim_areas(weighed_ledger())
    labels = {label for one in used for label in one.labels}
    assert "3-OH" not in labels
    assert ("3-OH",) in [one.labels for one in left]
    for one in used:
        # A tail correction under 4 % leaves areas within 1 % of the truth.
        assert one.area / one.n_protons == pytest.approx(1.0, abs=0.01)


@pytest.mark.parametrize(
    ("angle", "delay", "words"),
    [
        (30.0, 30.0, "The pulse is 30°"),
        (90.0, 2.0, "25 s are needed"),
        (None, 30.0, "pulse angle is not in the file"),
        (90.0, None, "delay between scans is not in the file"),
    ],
)
def test_short_pulses_and_delays_are_refused_with_the_reason(
    angle: float | None, delay: float | None, words: str
) -> None:
    ledger = weighed_ledger(pulse_angle_deg=angle, delay_s=delay)
    found = purity(ledger, STANDARD, WEIGHED)
    assert found.budget is None
    assert any(words in one for one in found.refusals)
    assert content(ledger).companions == ()


def test_a_measured_t1_lets_other_pulses_pass() -> None:
    ledger = weighed_ledger(pulse_angle_deg=30.0, delay_s=10.0)
    assert allowance(ledger).refusals
    assert not allowance(ledger, PulseConditions(t1_s=3.0)).refusals
    assert allowance(ledger, PulseConditions(t1_s=8.0)).refusals
    # What the user knows wins over the file.
    given = PulseConditions(pulse_angle_deg=90.0, delay_s=60.0)
    assert not allowance(ledger, given).refusals


def test_saturation_is_that_of_a_train_of_pulses() -> None:
    angle, repetition, t1 = math.radians(40.0), 1.7, 2.3
    along = 1.0
    for _ in range(200):  # until nothing changes any more
        along = 1.0 + (along * math.cos(angle) - 1.0) * math.exp(-repetition / t1)
    assert saturation(40.0, repetition, t1) == pytest.approx(1.0 - along, rel=1e-12)


def test_other_reasons_to_refuse() -> None:
    ledger = weighed_ledger()
    wrong = replace(ledger, verdict=replace(ledger.verdict, state="not reconciled"))
    assert "inconsistent" in purity(wrong, STANDARD, WEIGHED).refusals[0]
    wet = replace(ledger, evidence=replace(ledger.evidence, presaturated=True))
    assert "Water was suppressed" in purity(wet, STANDARD, WEIGHED).refusals[0]
    astray = replace(STANDARD, shift_ppm=8.5)
    assert "8.5 ppm" in purity(ledger, astray, WEIGHED).refusals[0]
    on_a_claim = replace(STANDARD, shift_ppm=1.25)
    assert purity(ledger, on_a_claim, WEIGHED).budget is None


def test_more_than_everything_is_said() -> None:
    light = Weighings(sample_mg=6.0, standard_mg=5.0, u_mg=0.01)
    found = purity(weighed_ledger(), STANDARD, light)
    assert any("More than everything" in one for one in found.notes)


def test_residual_solvent_in_mol_and_mass_percent() -> None:
    found = content(weighed_ledger(acetone_ratio=0.02))
    acetone = next(one for one in found.companions if one.name == "acetone")
    assert acetone.n_protons == 6
    # Noise under a signal of 0.12 H, and its neighbour's tails.
    assert acetone.mol_ratio == pytest.approx(0.02, abs=3 * acetone.mol_ratio_u)
    ratio = acetone.mol_ratio
    assert acetone.mol_percent == pytest.approx(100 * ratio / (1 + ratio))
    # 58.08 g/mol of acetone, 132.16 g/mol of ester.
    assert acetone.mass_percent == pytest.approx(
        100 * ratio * 58.08 / (132.16 + ratio * 58.08), rel=1e-3
    )
    assert acetone.shift_ppm == ACETONE_PPM
    assert any("unexplained" in one for one in found.not_counted)
