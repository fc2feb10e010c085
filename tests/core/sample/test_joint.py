from dataclasses import replace

import numpy as np
import pytest

from invented_ledger import overlapped_ledger
from shared_data import shared
from spinledger.detection.evidence import gather_evidence
from spinledger.io.read import read_acquired
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.sample.joint import joint_ledger
from spinledger.sample.joint_values import Witness, combined
from spinledger.sample.put_together import name_compound
from spinledger.sample.tables import (
    Figure,
    Table,
    brought_in_order,
    coupling_key,
    table_of,
)
from spinledger.structure.read import read_structure
from spinledger.values.ledger import Entry, Ledger


def with_coupling(ledger: Ledger, pair: tuple[str, str], j_hz: float) -> Ledger:
    def changed(entry: Entry) -> Entry:
        couplings = tuple(
            replace(one, j_hz=j_hz, j_sd_hz=0.03, determined=True)
            if {entry.claim, one.partner} == set(pair) else one
            for one in entry.couplings
        )  # fmt: skip
        return replace(entry, couplings=couplings)

    return replace(ledger, entries=tuple(changed(one) for one in ledger.entries))


def at_field(ledger: Ledger, frequency_mhz: float) -> Ledger:
    spectrum = replace(
        ledger.evidence.spectrum, spectrometer_frequency_mhz=frequency_mhz
    )
    return replace(ledger, evidence=replace(ledger.evidence, spectrum=spectrum))


def moved(ledger: Ledger, by_ppm: dict[str, float]) -> Ledger:
    entries = tuple(
        one
        if one.shift_ppm is None
        else replace(one, shift_ppm=one.shift_ppm + by_ppm.get(one.claim, 0.0))
        for one in ledger.entries
    )
    return replace(ledger, entries=entries)


def reconciled(ledger: Ledger) -> Ledger:
    return replace(ledger, verdict=replace(ledger.verdict, state="reconciled"))


@pytest.fixture(scope="module")
def plain() -> Ledger:
    return reconciled(overlapped_ledger())


def witnesses(*ledgers: Ledger) -> list[Witness]:
    return [
        Witness(name=f"spectrum {k}", role="main", ledger=one)
        for k, one in enumerate(ledgers, start=1)
    ]


def test_combination_is_the_weighted_mean_of_independent_values() -> None:
    values = [Figure(value=7.0, sd=0.1), Figure(value=7.3, sd=0.2)]
    mean, sd, chi2 = combined(values)
    # By hand: weights 100 and 25; chi2 = 0.3^2 / (0.1^2 + 0.2^2).
    assert mean == pytest.approx((700.0 + 182.5) / 125.0)
    assert chi2 == pytest.approx(1.8)
    assert sd == pytest.approx(125.0**-0.5 * 1.8**0.5)


def test_equal_spectra_share_their_couplings_without_complaint(plain: Ledger) -> None:
    joint = joint_ledger(witnesses(plain, plain), again=False)
    assert joint.state == "reconciled"
    assert joint.couplings
    assert all(one.agrees for one in joint.couplings)
    assert not any("differs" in one for one in joint.reasons)


def test_coupling_that_differs_between_spectra_is_said(plain: Ledger) -> None:
    pair = ("2-HA", "2-HB")
    one, two = with_coupling(plain, pair, -16.5), with_coupling(plain, pair, -15.2)
    joint = joint_ledger(witnesses(one, two), again=False)
    assert joint.state == "undecided"
    (said,) = [row for row in joint.reasons if "2-HA" in row and "differs" in row]
    assert "must be the same in Hz" in said


def test_splitting_that_grows_with_the_field_is_no_coupling(plain: Ledger) -> None:
    pair = ("2-HA", "2-HB")
    one = at_field(with_coupling(plain, pair, 8.0), 400.0)
    two = at_field(with_coupling(plain, pair, 12.0), 600.0)
    joint = joint_ledger(witnesses(one, two), again=False)
    (said,) = [row for row in joint.reasons if "2-HA" in row and "differs" in row]
    assert "grows with the field" in said


def test_shift_that_moved_alone_is_said_but_not_a_moved_reference(
    plain: Ledger,
) -> None:
    every = {one.claim: 0.05 for one in plain.entries}
    joint = joint_ledger(witnesses(plain, moved(plain, every)), again=False)
    assert not any("further apart" in one for one in joint.reasons)
    one = plain.entries[0].claim
    joint = joint_ledger(witnesses(plain, moved(plain, {one: 0.06})), again=False)
    (said,) = [row for row in joint.reasons if "further apart" in row]
    assert said.startswith(f"{one} stands at")


def test_spectrum_of_another_compound_is_left_out_and_kept(plain: Ledger) -> None:
    other = replace(plain, verdict=replace(plain.verdict, state="not reconciled"))
    joint = joint_ledger(witnesses(plain, other), again=False)
    assert [one.counts for one in joint.columns] == [True, False]
    assert any("may be another compound" in one for one in joint.reasons)
    assert all(len(row.cells) == 2 for row in joint.rows)


def test_look_alikes_are_brought_into_one_order(plain: Ledger) -> None:
    table = table_of(plain)
    figures = {
        coupling_key("2-HA", "3-H"): Figure(value=8.6, sd=0.1),
        coupling_key("2-HB", "3-H"): Figure(value=3.4, sd=0.1),
    }
    main = Table(shifts_ppm=table.shifts_ppm, couplings_hz=figures)
    other = with_coupling(with_coupling(plain, ("2-HA", "3-H"), 3.4),
                          ("2-HB", "3-H"), 8.6)  # fmt: skip
    found = brought_in_order(other, main, shift_sd_ppm=None)
    assert found.turned == (("2-HA", "2-HB"),)
    assert found.couplings_hz[coupling_key("2-HA", "3-H")].value == pytest.approx(8.6)


def solved(name: str, smiles: str) -> Ledger:
    evidence = gather_evidence(read_acquired(shared("acquired", name, "raw")))
    return reconcile(
        evidence, read_structure(smiles), options=ReconcileOptions(quick=True)
    )


def test_couplings_of_one_acid_at_two_fields_agree() -> None:
    smiles = "NCCCC(=O)O"
    one = solved("br_gaba_metabohub", smiles)
    two = solved("br_gamma-aminobutyric-acid_bmse000871", smiles)
    joint = joint_ledger(witnesses(one, two), again=False)
    both = [row for row in joint.couplings if row.n_values == 2]
    assert len(both) >= 2
    assert all(row.agrees for row in both)
    for row in both:
        values = [value.value for value in row.values if value is not None]
        # 0.4 Hz: conformers at the two temperatures and pH, see FLEXIBLE_SD_HZ.
        assert np.ptp(values) == pytest.approx(0.0, abs=0.4)


def test_reference_names_the_compound_that_was_filed_as_another() -> None:
    filed = solved(
        "neg_cinnamic-acid-claimed_spectrum-is-benzaldehyde", "O=C(O)/C=C/c1ccccc1"
    )
    assert filed.verdict.state == "not reconciled"
    true = replace(
        filed,
        evidence=gather_evidence(
            read_acquired(shared("acquired", "brd_benzaldehyde", "raw"))
        ),
    )
    other = replace(
        filed,
        evidence=gather_evidence(
            read_acquired(shared("acquired", "jc_estragole", "raw"))
        ),
    )
    references = [
        Witness(name="estragole", role="reference", ledger=other),
        Witness(name="benzaldehyde", role="reference", ledger=true),
    ]
    said = name_compound(Witness(name="tube", role="main", ledger=filed), references)
    assert said is not None
    assert "benzaldehyde" in said
