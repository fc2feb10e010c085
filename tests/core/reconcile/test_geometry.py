"""Geometry from couplings: made populations come back, published J find the isomer."""

from collections.abc import Mapping

import numpy as np
import pytest
from rdkit import Chem

from shared_data import shared
from spinledger.detection.evidence import gather_evidence
from spinledger.errors import CancelledError
from spinledger.io.read import read_acquired
from spinledger.prediction.claims import make_claims
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.hla import vicinal_over_conformers_hz
from spinledger.reconcile.configurations import (
    configurations,
    related_centres,
    relation_name,
)
from spinledger.reconcile.evaluate import evaluate, lay_out
from spinledger.reconcile.geometry import geometry_of, what_couplings_say
from spinledger.reconcile.measured_couplings import (
    MeasuredVicinal,
    carrier,
    labellings,
    vicinal_pairs,
)
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.solve import Limits
from spinledger.structure.conformers import ensemble
from spinledger.structure.read import molecule, read_structure
from spinledger.structure.settled import settled, with_hydrogens
from spinledger.structure.species import in_solution
from spinledger.values.geometry import Geometry

Values = Mapping[tuple[str, str], float]


def measured(
    smiles: str, values: Values, solvent: str
) -> tuple[Chem.Mol, list[MeasuredVicinal]]:
    structure = read_structure(smiles)
    claims = make_claims(structure, solvent=solvent)
    drawn = settled(in_solution(molecule(structure), solvent, None).species[0].mol)
    mol = with_hydrogens(drawn)
    rows = []
    for coupling in claims.couplings:
        first, second = (claims.particles[p].claim for p in coupling.pairs[0])
        assert first is not None
        assert second is not None
        labels = claims.claims[first].label, claims.claims[second].label
        j_hz = values.get(labels, values.get(labels[::-1]))
        pairs = tuple(
            pair
            for a, b in coupling.pairs
            for pair in vicinal_pairs(
                mol, claims.particles[a].hydrogens, claims.particles[b].hydrogens
            )
        )
        if j_hz is not None and pairs:
            bond = mol.GetBondBetweenAtoms(*(carrier(mol, h) for h in pairs[0]))
            rows.append(
                MeasuredVicinal(
                    first=first,
                    second=second,
                    pairs=pairs,
                    is_in_ring=bond.IsInRing(),
                    j_hz=j_hz,
                    j_sd_hz=0.1,
                )
            )
    assert len(rows) == len(values)
    return drawn, rows


def geometry(smiles: str, values: Values, solvent: str = "CDCl3") -> Geometry:
    drawn, rows = measured(smiles, values, solvent)
    claims = make_claims(read_structure(smiles), solvent=solvent)
    found = geometry_of(drawn, rows, claims, Limits(), in_water=solvent == "D2O")
    assert found is not None
    return found


def test_made_populations_come_back_within_their_sd() -> None:
    # The 2-H,3-H couplings of a butane chain made from chosen rotamer shares
    # with the equation itself; trust low, so that the data decide.
    smiles = "OC(=O)C[C@H](O)C(=O)O"
    drawn, rows = measured(smiles, {("2-H", "3-HA"): 0.0, ("2-H", "3-HB"): 0.0}, "D2O")
    mol = with_hydrogens(drawn)
    conformers = ensemble(mol, is_aqueous=True)
    frame = Frame(mol, is_aqueous=True, conformers=conformers)
    curves, antis = [], []
    for row in rows:
        first, second = row.pairs[0]
        a, b = carrier(mol, first), carrier(mol, second)
        curves.append(vicinal_over_conformers_hz(frame, first, a, b, second))
        antis.append(np.abs(frame.dihedral_deg(first, a, b, second)) > 120)
    truth = conformers.weights * np.where(antis[0], 4.0, 1.0)
    truth = truth / truth.sum()
    made = [
        MeasuredVicinal(
            first=row.first,
            second=row.second,
            pairs=row.pairs,
            is_in_ring=False,
            j_hz=float(truth @ curve),
            j_sd_hz=0.05,
        )
        for row, curve in zip(rows, curves, strict=True)
    ]
    found = labellings(mol, conformers, made, is_aqueous=True, trust=0.5)
    own = next(one for one in found if not one.swapped)
    for anti in antis:
        mean, sd = own.fit.mean_and_sd(anti.astype(np.float64))
        # Three sd, and the sd itself small enough to mean something.
        assert abs(mean - float(truth @ anti)) < 3 * sd
        assert sd < 0.15
    # Exchanging the labels of the CH2 is the other labelling tried.
    assert len(found) == 2


def test_trans_and_cis_tert_butylcyclohexanol() -> None:
    # CHOH at 3.5 ppm, tt, 11 and 4.3 Hz for trans; narrow (2.9 Hz) at 4.0 ppm for
    # cis: textbook values for axial and equatorial protons (from memory).
    trans = {("1-H", "2,6-HA"): 11.0, ("1-H", "2,6-HB"): 4.3}
    cis = {("1-H", "2,6-HA"): 2.9, ("1-H", "2,6-HB"): 2.9}
    smiles = "O[C@H]1CC[C@H](C(C)(C)C)CC1"
    for values, name in ((trans, "trans"), (cis, "cis")):
        found = geometry(smiles, values)
        assert found.configurations[0].name == name
        assert found.configurations[0].probability > 0.9
        assert any(f"favour {name}" in one for one in found.sentences)


def test_centres_turned_over_are_named_by_their_claims() -> None:
    # Anomeric proton beside an axial one: 8 Hz says axial, 3.5 Hz equatorial
    # (xylose and arabinose, textbook values, from memory).
    drawn = "CO[C@@H]1CC[C@@H](C)[C@H](C)O1"
    labels = {("2-H", "3-H"): 9.8, ("6-H", "5-HA"): 9.5, ("6-H", "5-HB"): 2.2}
    found = geometry(drawn, labels)
    best = found.configurations[0]
    assert best.probability > 0.8
    assert {one.name for one in found.configurations} >= {"as drawn"}
    assert sum("turned over" in one.name for one in found.configurations) == 3


def test_no_coupling_can_favour_an_open_chain_beyond_the_doubt() -> None:
    # One coupling across one bond: populations can make either isomer give it.
    found = geometry("CC[C@H](C)[C@H](N)C(=O)O", {("2-H", "3-H"): 4.0}, "D2O")
    assert {one.name for one in found.configurations} == {"syn", "anti"}
    assert found.configurations[0].probability < 0.75
    assert "do not decide" in found.sentences[0]


@pytest.mark.parametrize(
    ("smiles", "name"),
    [
        ("C[C@H]1CCCC[C@@H]1C", "trans"),  # (1R,2R) or (1S,2S)
        ("C[C@H]1CCCC[C@H]1C", "cis"),
        ("C[C@@H](O)[C@H](N)C(=O)O", "syn"),  # threonine
        ("C[C@H](O)[C@H](N)C(=O)O", "anti"),  # allo-threonine
        ("CC[C@H](C)[C@H](N)C(=O)O", "anti"),  # isoleucine
        ("C[C@H](O)[C@@H](C)CC", "syn"),
    ],
)
def test_relation_is_named_as_in_textbooks(smiles: str, name: str) -> None:
    drawn = settled(molecule(read_structure(smiles)))
    mol = with_hydrogens(drawn)
    positions = ensemble(mol, is_aqueous=False).positions[0]
    first, second = related_centres(drawn)
    assert relation_name(mol, positions, first, second) == name


@pytest.mark.parametrize(
    ("smiles", "count"),
    [
        ("OC(=O)[C@H](O)[C@@H](O)C(=O)O", 2),  # meso and the racemic pair
        ("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O", 4),  # menthol: 2^3 / 2
        ("CC(O)C(C)Cl", 2),  # open: both, none as drawn
        ("C[C@H](N)C(=O)O", 0),  # one centre
        ("C[C@H](O)CC[C@H](C)Cl", 0),  # too far apart for couplings
    ],
)
def test_configurations_are_counted_without_mirror_images(
    smiles: str, count: int
) -> None:
    drawn = settled(molecule(read_structure(smiles)))
    found = configurations(drawn, limit=20)
    assert len({one.smiles for one in found}) == len(found) == count


def test_cancel_is_heard() -> None:
    drawn, rows = measured("C[C@@H](O)[C@H](N)C(=O)O", {("2-H", "3-H"): 4.9}, "D2O")
    claims = make_claims(read_structure("C[C@@H](O)[C@H](N)C(=O)O"), solvent="D2O")

    def stop() -> None:
        raise CancelledError("stopped")

    with pytest.raises(CancelledError, match="stopped"):
        geometry_of(drawn, rows, claims, Limits(check=stop), in_water=True)


def test_acquired_isoleucine_says_something_of_its_chain() -> None:
    place = shared("acquired", "brs_l-isoleucine_500-0p5mM")
    evidence = gather_evidence(read_acquired(place))
    bench = lay_out(evidence, ReconcileOptions(quick=True))
    own = evaluate(
        read_structure("CC[C@H](C)[C@H](N)C(=O)O"), bench, Limits(max_refined=2)
    )
    found = what_couplings_say(own, Limits())
    assert found is not None
    row = next(
        one for one in found.dihedrals if {one.first, one.second} == {"2-H", "3-H"}
    )
    # Published J(2,3) of isoleucine in water: 3.97 Hz (BMRB bmse000041), gauche;
    # the sample is 0.5 mM, and the fit is good to some tenths of a Hz.
    assert row.j_hz == pytest.approx(3.97, abs=0.6)
    assert row.anti_share < 0.4
