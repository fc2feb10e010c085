"""Shift prediction: parts against closed forms, the whole against increment tables."""

import csv
from pathlib import Path

import numpy as np
import pytest
from rdkit import Chem

from shared_data import shared
from spinledger.prediction.shifts import ShiftPrediction, load_model, predict_shifts
from spinledger.prediction.shifts_alkene import (
    alkene_shift_ppm,
    cis_trans_difference_ppm,
)
from spinledger.prediction.shifts_faces import face_counts
from spinledger.prediction.shifts_features import Surroundings, feature_matrix
from spinledger.prediction.shifts_increments import (
    FragmentCounts,
    IncrementTable,
    fragment_counts,
)
from spinledger.prediction.shifts_network import Network
from spinledger.prediction.shifts_reasons import known_environments
from spinledger.prediction.shifts_solvents import solvent_differences_ppm
from spinledger.prediction.shifts_spheres import coarse_codes, fine_codes, fit_table
from spinledger.prediction.shifts_types import PROTON_CLASSES, atom_type, proton_class


def predicted(smiles: str, atom: int, solvent: str | None = "CDCl3") -> ShiftPrediction:
    mol = Chem.MolFromSmiles(smiles)
    return predict_shifts(mol, [atom], solvent=solvent)[0]


def rows(name: str) -> list[dict[str, str]]:
    with Path(shared("reference", name)).open(encoding="utf-8") as handle:
        return list(csv.DictReader(handle))


def attached(core: str, substituent: str) -> str:
    """SMILES of a core with a substituent that is written with a leading star."""
    return core + substituent.removeprefix("*")


def test_increment_table_of_benzenes_is_a_sanity_band() -> None:
    """Monosubstituted benzenes, additivity table on 7.26 ppm (CDCl3)."""
    gaps, outside = [], 0
    for row in rows("increments_benzene.csv"):
        mol = Chem.MolFromSmiles(attached("c1ccccc1", row["smiles"]))
        if not row["smiles"] or mol is None:
            continue
        found = predict_shifts(mol, [4, 3, 2], solvent="CDCl3")
        for place, answer in zip(("ortho", "meta", "para"), found, strict=True):
            expected = float(row["base_ppm"]) + float(row[place])
            gaps.append(abs(answer.shift_ppm - expected))
            # 0.15 ppm: what the tables themselves are good for.
            outside += gaps[-1] > answer.half_width_95_ppm + 0.15
    assert len(gaps) > 60
    assert float(np.mean(gaps)) < 0.15
    assert outside <= 0.06 * len(gaps)


def test_increment_table_of_vinyl_compounds_is_a_sanity_band() -> None:
    """CH2=CHX: the =CHX proton by the published increments on 5.25 ppm."""
    gaps = []
    for row in rows("increments_alkene.csv"):
        smiles = attached("C=C", row["smiles"])
        mol = Chem.MolFromSmiles(smiles)
        if not row["smiles"] or mol is None or "1" in row["smiles"]:
            continue
        (answer,) = predict_shifts(mol, [1], solvent="CDCl3")
        gaps.append(abs(answer.shift_ppm - 5.25 - float(row["Z_gem"])))
    assert len(gaps) > 15
    assert float(np.mean(gaps)) < 0.3  # the table's own error is about 0.15


def test_shoolery_rule_is_a_sanity_band() -> None:
    """CH3-CH2-X by the rule 0.23 + sum of sigma; good to some tenths."""
    sigma = {
        row["smiles"]: float(row["sigma_ppm"])
        for row in rows("increments_shoolery.csv")
    }
    methyl = sigma["*[CX4]"]
    gaps = []
    for smiles, value in sigma.items():
        mol = Chem.MolFromSmiles(attached("CC", smiles)) if smiles else None
        if mol is None or "X4" in smiles:
            continue
        (answer,) = predict_shifts(mol, [1], solvent="CDCl3")
        gaps.append(abs(answer.shift_ppm - 0.23 - methyl - value))
    assert len(gaps) > 10
    assert float(np.median(gaps)) < 0.35


@pytest.mark.parametrize(
    ("smiles", "atom", "expected_ppm"),
    [
        # Fulmer et al., Organometallics 29 (2010) 2176, CDCl3.
        ("CC(C)=O", 0, 2.17),
        ("CCOC(C)=O", 1, 4.12),
        ("CCOC(C)=O", 0, 1.26),
        ("C1CCOC1", 0, 1.85),
        ("C1CCOC1", 2, 3.76),
        ("CC#N", 0, 2.10),
        ("CN(C)C=O", 3, 8.02),
        ("c1ccccc1", 0, 7.36),
        ("c1ccncc1", 4, 8.62),
        ("C1CCCCC1", 0, 1.43),
        ("CCOCC", 1, 3.48),
        ("Cc1ccccc1", 0, 2.36),
        ("CCO", 1, 3.72),
    ],
)
def test_common_compounds_lie_within_the_95_percent_interval(
    smiles: str, atom: int, expected_ppm: float
) -> None:
    found = predicted(smiles, atom)
    assert abs(found.shift_ppm - expected_ppm) <= found.half_width_95_ppm


def test_batch_and_single_prediction_agree() -> None:
    mol = Chem.MolFromSmiles("COc1ccc(CC(N)C(=O)O)cc1")
    atoms = [0, 3, 4, 6, 7]
    together = predict_shifts(mol, atoms, solvent="CDCl3")
    for atom, found in zip(atoms, together, strict=True):
        alone = predict_shifts(mol, [atom], solvent="CDCl3")[0]
        # 1e-5: float32 sums in another order.
        assert alone.shift_ppm == pytest.approx(found.shift_ppm, abs=1e-5)
        assert alone.source == found.source


def test_order_of_atoms_does_not_matter() -> None:
    first = Chem.MolFromSmiles("CCOC(=O)c1ccccc1")
    second = Chem.MolFromSmiles("c1ccccc1C(=O)OCC")
    assert predict_shifts(first, [1], solvent="CDCl3")[0].shift_ppm == pytest.approx(
        predict_shifts(second, [9], solvent="CDCl3")[0].shift_ppm, abs=1e-4
    )


def test_interval_is_wider_where_the_solvent_is_not_chloroform() -> None:
    widths = {s: predicted("CCOC(C)=O", 1, s).sd_ppm for s in ("CDCl3", "D2O", "C6D6")}
    assert widths["CDCl3"] < widths["D2O"] < widths["C6D6"]


def test_no_atoms_give_no_predictions() -> None:
    assert predict_shifts(Chem.MolFromSmiles("CC"), []) == ()


def test_source_is_told_in_words() -> None:
    assert "sphere" in predicted("CCO", 1).source
    assert predicted("CCO", 1).examples >= 1


def test_intervals_are_nested() -> None:
    for smiles, atom in (("CCO", 1), ("c1ccccc1", 0), ("C=CC", 1), ("CC=O", 1)):
        found = predicted(smiles, atom)
        assert 0 < found.sd_ppm < found.half_width_95_ppm


def test_model_is_read_once() -> None:
    assert load_model() is load_model()


@pytest.mark.parametrize(
    ("smiles", "atom", "name", "kind"),
    [
        ("CC(=O)N", 1, "CON", "CHO"),
        ("CC(=O)OC", 3, "Oest", "OH"),
        ("C=CC", 1, "Cvin", "alkene"),
        ("CC=O", 1, "CO", "CHO"),
        ("C#C", 0, "Cyne", "alkyne"),
        ("c1ccncc1", 2, "CarN", "ArH"),
        ("CS(C)=O", 1, "S4", "SH"),
        ("C[N+](C)(C)C", 1, "N+", "NH"),
        ("CC(C)(C)C", 1, "C3q", "other"),
    ],
)
def test_atoms_are_typed(smiles: str, atom: int, name: str, kind: str) -> None:
    found = Chem.MolFromSmiles(smiles).GetAtomWithIdx(atom)
    assert atom_type(found) == name
    assert proton_class(found) == kind


def test_table_shrinks_each_radius_to_the_one_before() -> None:
    """Two ethanol CH2 labels: running estimate (n m + e) / (n + 1), by hand."""
    mol = Chem.MolFromSmiles("CCO")
    fine = np.repeat(fine_codes(mol)[[1]], 2, axis=0)
    coarse = np.repeat(coarse_codes(mol)[[1]], 2, axis=0)
    shifts = np.array([3.6, 3.8])
    table = fit_table(fine, coarse, shifts, np.array(["CH2", "CH2"]))
    found = table.look_up(fine[:1], coarse[:1], ["CH2"])
    # The class median is 3.7 and so is every code's median.
    assert found.estimates_ppm[0] == pytest.approx(3.7, abs=1e-6)
    assert found.depths[0] == 5
    assert found.examples[0] == 2
    assert found.spreads_ppm[0] == pytest.approx(0.1, abs=1e-6)
    other = Chem.MolFromSmiles("CCN")
    known = table.look_up(fine_codes(other)[[1]], coarse_codes(other)[[1]], ["CH2"])
    assert known.depths[0] == 0  # only the carbon itself is known


def test_codes_tell_surroundings_at_the_right_radius() -> None:
    ether, thioether = Chem.MolFromSmiles("CCCCO"), Chem.MolFromSmiles("CCCCS")
    same = fine_codes(ether)[0] == fine_codes(thioether)[0]
    # The hetero atom is four bonds from atom 0.
    assert same.tolist() == [True, True, True, True, False, False]


def test_increments_add_up() -> None:
    counts = FragmentCounts(
        keys=np.array([5, 9, 9], np.uint32),
        weights=np.array([1.0, 2.0, 1.0], np.float32),
        starts=np.array([0, 2, 3]),
    )
    table = IncrementTable(
        keys=np.array([5, 7, 9], np.uint32),
        increments_ppm=np.array([0.1, 5.0, 0.2], np.float32),
        class_medians_ppm=np.full(len(PROTON_CLASSES), 1.0),
    )
    assert table.estimate(counts, ["CH3", "CH2"]) == pytest.approx([1.5, 1.2])


def test_fragment_counts_do_not_depend_on_atom_order() -> None:
    for smiles, atom in (("CCOC", 1), ("COCC", 2)):
        mol = Chem.MolFromSmiles(smiles)
        found = fragment_counts(mol, [atom], Chem.GetDistanceMatrix(mol))
        order = np.argsort(found.keys)
        if smiles == "CCOC":
            first = (found.keys[order], found.weights[order])
    assert np.array_equal(first[0], found.keys[order])
    assert np.array_equal(first[1], found.weights[order])


def test_network_is_its_formula() -> None:
    """One hidden layer of two units, worked out by hand."""
    network = Network(
        centre=np.array([1.0, 0.0], np.float32),
        spread=np.array([2.0, 1.0], np.float32),
        weights=(
            np.array([[1.0, -1.0], [0.5, 0.0]], np.float32),
            np.array([[2.0], [3.0]], np.float32),
        ),
        biases=(np.array([0.0, 0.5], np.float32), np.array([0.1], np.float32)),
    )
    # Scaled input (1, 2): units max(0, 2) = 2 and max(0, -0.5) = 0; 2 * 2 + 0.1.
    assert network.predict(np.array([[3.0, 2.0]], np.float32)) == pytest.approx([4.1])


def test_faces_of_glucose_by_hand() -> None:
    """Beta-glucose: all groups equatorial, so neighbours on the ring alternate."""
    mol = Chem.MolFromSmiles("OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O")
    rings = [tuple(ring) for ring in mol.GetRingInfo().AtomRings()]
    # H5 (atom 2): O4 one step away cis to it; O3 and O1 two steps away trans.
    (counts,) = face_counts(mol, rings, [2]).reshape(1, 3, 3, 2)
    assert counts[0, 1].tolist() == [1.0, 0.0]
    assert counts[1, 1].tolist() == [0.0, 2.0]


def test_faces_are_unknown_without_configuration() -> None:
    mol = Chem.MolFromSmiles("OCC1OC(O)C(O)C(O)C1O")
    rings = [tuple(ring) for ring in mol.GetRingInfo().AtomRings()]
    assert not face_counts(mol, rings, [2, 4]).any()


def test_features_are_finite_but_for_missing_neighbours() -> None:
    mol = Chem.MolFromSmiles("CC(=O)/C=C/c1ccc(F)cc1")
    matrix = feature_matrix(Surroundings(mol), [0, 3, 4, 6])
    assert matrix.shape[0] == 4
    assert not np.isinf(matrix).any()


@pytest.mark.parametrize(
    ("smiles", "cis", "trans", "expected_ppm"),
    [
        # Table values, differences worked out by hand: Z(cis) - Z(trans).
        ("C=CC#N", 2, None, 0.20),
        ("C=CC(=O)OC", 2, None, 0.63),
        ("C=COC(C)=O", 2, None, 0.29),
        ("C=C(C)C", 2, 3, 0.0),
    ],
)
def test_vinyl_difference_from_the_table(
    smiles: str, cis: int, trans: int | None, expected_ppm: float
) -> None:
    found = cis_trans_difference_ppm(Chem.MolFromSmiles(smiles), 1, cis, trans)
    assert found == pytest.approx(expected_ppm, abs=1e-9)


def test_alkene_increments_add_up() -> None:
    """Vinyl acetate, =CH2 proton trans to the ester: 5.25 - 0.64 = 4.61."""
    mol = Chem.MolFromSmiles("C=COC(C)=O")
    found = alkene_shift_ppm(mol, 1, geminal=None, cis=None, trans=2)
    assert found == pytest.approx(4.61, abs=1e-9)


def test_gap_of_ring_protons_is_larger_than_of_chain_protons() -> None:
    """Axial and equatorial protons stand apart, a distant chain CH2 hardly does."""
    ring = predicted("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O", 8).gap_ppm
    chain = predicted("CC(Cl)CCCC", 4).gap_ppm
    assert ring > chain
    assert 0.2 < ring < 1.5


def test_reasons_go_from_near_to_far() -> None:
    environments = known_environments(Chem.MolFromSmiles("CCOC(C)=O"), 1)
    assert [e.sphere for e in environments] == list(range(len(environments)))
    counts = [e.examples for e in environments]
    assert counts == sorted(counts, reverse=True)
    assert environments[0].fragment == "[CH2:1]"
    assert environments[1].fragment in ("C[CH2:1]O", "O[CH2:1]C", "[CH2:1](C)O")
    # An ester OCH2 of an ethyl group stands near 4.12 ppm (handbook).
    assert environments[-1].median_ppm == pytest.approx(4.15, abs=0.15)


@pytest.mark.parametrize(
    ("smiles", "atom", "solvent", "published_ppm"),
    [
        # Fulmer et al., Organometallics 29 (2010) 2176, table 1.
        ("CCO", 1, "DMSO-d6", 3.44),
        ("CC(C)O", 1, "DMSO-d6", 3.78),
        ("CCO", 1, "acetone-d6", 3.57),
        ("CCO", 1, "C6D6", 3.34),
        ("CC(C)(C)OC", 4, "C6D6", 3.04),
        # Menthol, H1 in DMSO-d6 (from memory): 3.15.
        ("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O", 9, "DMSO-d6", 3.15),
    ],
)
def test_solvents_move_shifts_as_published(
    smiles: str, atom: int, solvent: str, published_ppm: float
) -> None:
    found = predicted(smiles, atom, solvent)
    assert abs(found.shift_ppm - published_ppm) <= found.half_width_95_ppm
    # And nearer than what is foretold for CDCl3.
    apolar = predicted(smiles, atom, "CDCl3").shift_ppm
    assert abs(found.shift_ppm - published_ppm) < abs(apolar - published_ppm)


def test_unknown_solvents_move_nothing() -> None:
    mol = Chem.MolFromSmiles("CCO")
    assert solvent_differences_ppm(mol, [0, 1], None) == (0.0, 0.0)
    assert solvent_differences_ppm(mol, [0, 1], "D2O") == (0.0, 0.0)
    assert solvent_differences_ppm(mol, [1], "DMSO-d6") == (-0.24,)
