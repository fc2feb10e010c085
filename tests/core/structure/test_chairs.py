"""Chairs of six-rings against textbook conformations and A values."""

import math

import pytest
from rdkit import Chem

from spinledger.structure.chairs import chair_rings
from spinledger.structure.read import molecule, read_structure
from spinledger.structure.settled import settled
from spinledger.structure.topicity import proton_groups
from spinledger.structure.vantage import axial_preferences, places


def axial_share(smiles: str, atom: int, group: int) -> float:
    """Share of the time that a substituent is axial."""
    (ring,) = chair_rings(Chem.MolFromSmiles(smiles))
    return ring.axial_share(ring.atoms.index(atom), group)


def places_of(smiles: str) -> dict[int, list[str]]:
    mol = settled(molecule(read_structure(smiles)))
    groups = proton_groups(mol)
    found: dict[int, list[str]] = {}
    for group, place in zip(groups, places(mol, groups), strict=True):
        found.setdefault(group.carriers[0], []).append(place)
    return found


def test_methylcyclohexane_follows_its_a_value() -> None:
    """1.74 kcal/mol at 298 K: 1 / (1 + exp(1.74 / 0.593)) = 5.1 % axial."""
    expected = 1.0 / (1.0 + math.exp(1.74 / 0.593))
    # 1e-9: the same closed form.
    assert axial_share("CC1CCCCC1", 1, 0) == pytest.approx(expected, abs=1e-9)


def test_menthol_has_all_groups_equatorial() -> None:
    smiles = "CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O"
    for atom, group in ((3, 1), (6, 7), (9, 10)):
        assert axial_share(smiles, atom, group) < 0.01


def test_neomenthol_has_its_hydroxyl_axial() -> None:
    smiles = "CC(C)[C@@H]1CC[C@@H](C)C[C@@H]1O"
    assert axial_share(smiles, 9, 10) > 0.98
    assert axial_share(smiles, 3, 1) < 0.02


@pytest.mark.parametrize(
    ("smiles", "is_axial"),
    [
        ("OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O", False),  # beta-glucose
        ("OC[C@H]1O[C@H](O)[C@H](O)[C@@H](O)[C@@H]1O", True),  # alpha-glucose
    ],
)
def test_glucose_is_a_chair_whose_anomers_differ_at_one_centre(
    smiles: str, *, is_axial: bool
) -> None:
    (ring,) = chair_rings(Chem.MolFromSmiles(smiles))
    for atom, group in ((2, 1), (6, 7), (8, 9), (10, 11)):
        assert ring.axial_share(ring.atoms.index(atom), group) < 0.01
    assert (ring.axial_share(ring.atoms.index(4), 5) > 0.99) == is_axial


def test_trans_decalin_is_held_with_both_fusion_protons_axial() -> None:
    found = places_of("C1CC[C@H]2CCCC[C@@H]2C1")
    assert found[3] == ["axial"]


def test_trans_and_cis_disubstituted_rings() -> None:
    """1,4-dimethyl: trans is diequatorial, cis has one axial either way."""
    trans, cis = "C[C@H]1CC[C@H](C)CC1", "C[C@H]1CC[C@@H](C)CC1"
    shares = {name: axial_share(name, 1, 0) for name in (trans, cis)}
    assert min(shares.values()) < 0.01
    # The two chairs of the cis compound are mirror images: exactly one half.
    assert max(shares.values()) == pytest.approx(0.5, abs=1e-9)


@pytest.mark.parametrize(
    ("smiles", "reason"),
    [
        ("c1ccccc1", "aromatic"),
        ("C1CCCC1", "five atoms"),
        ("C1CC2CCC1C2", "bridged, a boat"),
        ("C1=CCCC=C1", "more than one trigonal atom"),
        ("CC1CCCCC1C", "relative configuration open"),
    ],
)
def test_other_rings_are_left_out(smiles: str, reason: str) -> None:
    assert reason
    assert chair_rings(settled(molecule(read_structure(smiles)))) == ()


def test_ring_protons_are_named_by_their_place() -> None:
    found = places_of("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O")
    for atom in (3, 6, 9):
        assert found[atom] == ["axial"]
    for atom in (4, 5, 8):
        kinds = sorted(place.split(", ")[0] for place in found[atom])
        assert kinds == ["axial", "equatorial"]


def test_a_ring_that_turns_has_no_named_places() -> None:
    assert set(places_of("C1CCCCC1")[0]) == {""}


def test_preference_of_alike_protons_is_one_number() -> None:
    """Cyclohexanol: 0.9 kcal/mol, so H1 is 82 % axial: 2 * 0.82 - 1 = 0.64."""
    mol = settled(molecule(read_structure("OC1CCCCC1")))
    groups = proton_groups(mol)
    found = axial_preferences(mol, groups)
    own = next(i for i, g in enumerate(groups) if g.carriers == (1,))
    expected = 2.0 / (1.0 + math.exp(-0.9 / 0.593)) - 1.0
    # 2e-3: shares are rounded to three decimals.
    assert found[own] == pytest.approx(expected, abs=2e-3)
    # Protons cis and trans to the hydroxyl on C2 and C6 go opposite ways.
    pair = [found[i] for i, g in enumerate(groups) if g.carriers == (2, 6)]
    assert len(pair) == 2
    assert pair[0] == pytest.approx(-pair[1], abs=1e-9)


def test_pro_r_and_pro_s_are_named_by_the_sequence_rule() -> None:
    """L-Alaninol-type CH2: worked out by hand for (S)-2-butanol's C3.

    Replacing one of the two C3 protons by deuterium gives (2S,3R) or (2S,3S);
    both labels must appear, one each.
    """
    assert sorted(places_of("C[C@H](O)CC")[3]) == ["pro-R", "pro-S"]


def test_pro_r_of_ethanol_type_pair_by_hand() -> None:
    """Citrate-like CH2 beside a tagged centre, CIP checked on the deuterated isomer.

    The hydrogen named pro-R gives, as deuterium written into the SMILES, the R
    isomer by RDKit's own labels of the heavy-atom structure.
    """
    mol = settled(molecule(read_structure("N[C@@H](CO)C(=O)O")))
    groups = proton_groups(mol)
    named = dict(zip((g.hydrogens for g in groups), places(mol, groups), strict=True))
    pair = {name: h for h, name in named.items() if name.startswith("pro-")}
    assert set(pair) == {"pro-R", "pro-S"}
    full = Chem.AddHs(mol)
    for name, (hydrogen,) in pair.items():
        copy = Chem.RWMol(full)
        copy.GetAtomWithIdx(hydrogen).SetIsotope(2)
        again = Chem.MolFromSmiles(Chem.MolToSmiles(Chem.RemoveHs(copy.GetMol())))
        carrier = next(
            a
            for a in again.GetAtoms()
            if any(n.GetIsotope() == 2 for n in a.GetNeighbors())
        )
        assert carrier.GetProp("_CIPCode") == name[-1]


def test_open_configuration_names_no_prochirality() -> None:
    assert all(
        "pro-" not in place
        for found in places_of("CC(O)CC").values()
        for place in found
    )
