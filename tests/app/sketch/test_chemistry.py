"""Texts to drawings and back; faults; clean layouts."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from rdkit import Chem

from spinledger.errors import StructureError
from spinledger.structure.read import read_structure
from spinledger_app.sketch.chemistry import cleaned_up, from_text, meaning, smiles
from spinledger_app.sketch.drawing import EMPTY, with_charge, with_order, with_wedge
from spinledger_app.sketch.growth import ring_at, sprouted
from spinledger_app.sketch.molfile import molblock

STRUCTURES = [
    "CC=CC",
    "C/C=C\\C",
    "C[C@@H](O)CC(=O)OCC",
    "C[C@H]1CC[C@@H](C)CC1",
    "C[S@](=O)c1ccccc1",
    "C/C(=N\\O)c1ccccc1",
    "c1ccc2[nH]ccc2c1",
    "[O-][n+]1ccccc1",
    "CC(=O)[O-].[Na+]",
    "[13CH3]C([2H])([2H])O",
    "C[Si](C)(C)C",
    "CCOP(=O)(O)OCC",
    "OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O",
    "C[C@]12CC[C@H]3[C@H]([C@@H]1CC[C@@H]2O)CCC4=CC(=O)CC[C@]34C",
]


@pytest.mark.parametrize("text", STRUCTURES)
def test_structure_survives_drawing_molfile_and_clean_up(text: str) -> None:
    expected = Chem.MolToSmiles(Chem.MolFromSmiles(text))
    drawing = from_text(text)
    assert smiles(drawing) == expected
    assert read_structure(molblock(drawing)).smiles == expected
    assert smiles(cleaned_up(drawing)) == expected


def test_bond_length_of_a_pasted_drawing_is_one() -> None:
    drawing = from_text("CCCCO")
    for bond in drawing.bonds:
        places = (drawing.atoms[bond.start].place, drawing.atoms[bond.end].place)
        # 0.01: RDKit's layout of chains is exact to about 1e-3.
        assert math.dist(*places) == pytest.approx(1.0, abs=0.01)


def test_inchi_molfile_sdf_and_cdxml_are_read() -> None:
    inchi = "InChI=1S/C3H8O/c1-3(2)4/h3-4H,1-2H3"
    block = molblock(from_text("CC(C)O"))
    assert smiles(from_text(inchi)) == "CC(C)O"
    assert smiles(from_text(block)) == "CC(C)O"
    assert smiles(from_text(block + "$$$$\n")) == "CC(C)O"
    assert smiles(from_text(CDXML)) == "CCO"


# Three atoms and two bonds, the least that the published format asks for.
CDXML = """<?xml version="1.0" encoding="UTF-8" ?>
<CDXML BondLength="30"><page id="1"><fragment id="2">
<n id="3" p="10 20"/><n id="4" p="36 35"/>
<n id="5" p="62 20" Element="8" NumHydrogens="1"/>
<b id="6" B="3" E="4"/><b id="7" B="4" E="5"/>
</fragment></page></CDXML>
"""


def test_drawn_places_of_a_molfile_are_kept() -> None:
    ring = ring_at(EMPTY, (0, 0), 6, is_aromatic=True)
    again = from_text(molblock(ring))
    # 1e-4: a molfile has four decimals.
    for before, after in zip(ring.atoms, again.atoms, strict=True):
        assert after.place == pytest.approx(before.place, abs=2e-4)


def test_several_structures_and_nonsense_are_refused_in_words() -> None:
    block = molblock(from_text("CC(C)O"))
    with pytest.raises(StructureError, match="holds 2 structures"):
        from_text(f"{block}$$$$\n{block}$$$$\n")
    with pytest.raises(StructureError, match="neither a file nor a SMILES"):
        from_text("hello there")
    with pytest.raises(StructureError, match="holds no structure"):
        from_text("<CDXML></CDXML>")


def test_valence_fault_names_atom_and_count_and_goes_with_a_charge() -> None:
    drawing = ring_at(EMPTY, (0, 0), 6, is_aromatic=True)
    drawing = sprouted(drawing, 0).drawing
    double = with_order(drawing, len(drawing.bonds) - 1, 2)
    found = meaning(double)
    assert [fault.atom for fault in found.faults] == [0]
    assert found.faults[0].sentence.startswith("C has 5 bonds")
    assert (found.smiles, found.formula) == ("", "")
    with pytest.raises(ValueError, match="C has 5 bonds"):
        smiles(double)
    ammonium = from_text("CN(C)C")
    four = sprouted(ammonium, 1).drawing
    assert [fault.atom for fault in meaning(four).faults] == [1]
    assert smiles(with_charge(four, 1, 1)) == "C[N+](C)(C)C"


def test_every_faulty_atom_is_listed() -> None:
    drawing = from_text("CC")
    for atom in (0, 1):
        for _ in range(4):
            drawing = sprouted(drawing, atom).drawing
    assert {fault.atom for fault in meaning(drawing).faults} == {0, 1}


def test_faulty_drawing_can_be_cleaned_up_too() -> None:
    drawing = from_text("CN(C)C")
    drawing = sprouted(drawing, 1).drawing
    tidy = cleaned_up(drawing)
    assert tidy.bonds == drawing.bonds
    assert [one.element for one in tidy.atoms] == [one.element for one in drawing.atoms]


def test_hydrogens_formula_and_labels_are_those_of_the_structure() -> None:
    found = meaning(from_text("C[C@@H](O)CC(=O)OCC"))
    assert found.formula == "C6H12O3"
    assert sum(found.hydrogens) == 12
    assert found.labels.count("R") == 1


def test_clean_up_spreads_atoms_that_lay_on_each_other() -> None:
    drawing = from_text("CCCCCC")
    heaped = replace(
        drawing, atoms=tuple(replace(one, x=0.01 * one.x) for one in drawing.atoms)
    )
    tidy = cleaned_up(heaped)
    places = [one.place for one in tidy.atoms]
    apart = [math.dist(a, b) for i, a in enumerate(places) for b in places[:i]]
    assert min(apart) > 0.9


def test_locants_of_a_text_are_kept() -> None:
    drawing = from_text("[CH3:4][CH2:2][OH:9]")
    assert [one.locant for one in drawing.atoms] == [4, 2, 9]
    assert read_structure(molblock(drawing)).locants == ("4", "2", "9")


def test_molfile_of_more_than_999_atoms_is_refused() -> None:
    drawing = replace(EMPTY, atoms=from_text("C").atoms * 1000)
    with pytest.raises(ValueError, match="at most 999"):
        molblock(drawing)


def test_clean_up_keeps_a_wavy_line() -> None:
    drawing = with_wedge(from_text("CC(O)CC"), 1, "either", narrow_end=1)
    tidy = cleaned_up(drawing)
    index = tidy.bond_between(1, 2)
    assert index is not None
    assert tidy.bonds[index].wedge == "either"
    assert tidy.bonds[index].start == 1
    assert smiles(tidy) == "CCC(C)O"
