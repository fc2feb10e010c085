"""Drawing functions against SMILES and geometry worked out by hand."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from spinledger_app.sketch.chemistry import smiles
from spinledger_app.sketch.drawing import (
    EMPTY,
    Atom,
    Bond,
    Drawing,
    centre,
    fused,
    merged,
    moved,
    part,
    rotated,
    turned_round,
    with_charge,
    with_element,
    with_next_isotope,
    with_next_order,
    with_next_wedge,
    with_order,
    without,
)
from spinledger_app.sketch.growth import (
    first_bond,
    free_angle_rad,
    joined,
    ring_at,
    ring_on_atom,
    ring_on_bond,
    sprouted,
    wedged_between,
)


def chain(n_atoms: int) -> Drawing:
    grown = first_bond(EMPTY, (0.0, 0.0))
    for _ in range(n_atoms - 2):
        grown = sprouted(grown.drawing, grown.atom)
    return grown.drawing


def bond_angle_deg(drawing: Drawing, a: int, middle: int, b: int) -> float:
    x, y = drawing.atoms[middle].place
    first = math.atan2(drawing.atoms[a].y - y, drawing.atoms[a].x - x)
    second = math.atan2(drawing.atoms[b].y - y, drawing.atoms[b].x - x)
    return abs(math.degrees(math.remainder(first - second, 2 * math.pi)))


def test_clicked_chain_is_level_zigzag_of_120_degrees() -> None:
    drawn = chain(6)
    assert smiles(drawn) == "CCCCCC"
    for middle in range(1, 5):
        # 1e-6: floating point only; the angles are exact otherwise.
        assert bond_angle_deg(drawn, middle - 1, middle, middle + 1) == pytest.approx(
            120, abs=1e-6
        )
    assert [round(one.y, 6) for one in drawn.atoms] == [0, 0.5, 0, 0.5, 0, 0.5]


def test_bond_beyond_a_triple_bond_goes_straight_on() -> None:
    drawn = with_order(chain(2), 0, 3)
    grown = sprouted(drawn, 1)
    assert bond_angle_deg(grown.drawing, 0, 1, 2) == pytest.approx(180, abs=1e-6)


def test_third_bond_takes_the_widest_gap() -> None:
    grown = sprouted(chain(3), 1)
    assert smiles(grown.drawing) == "CC(C)C"
    assert bond_angle_deg(grown.drawing, 0, 1, 3) == pytest.approx(120, abs=1e-6)
    assert bond_angle_deg(grown.drawing, 2, 1, 3) == pytest.approx(120, abs=1e-6)


def test_bond_grown_onto_an_atom_joins_it() -> None:
    drawn = chain(3)
    grown = joined(drawn, 2, 0)
    assert smiles(grown.drawing) == "C1CC1"
    assert len(grown.drawing.atoms) == 3
    assert joined(grown.drawing, 2, 0).drawing == grown.drawing


def test_order_goes_from_single_to_triple_and_back() -> None:
    drawn = chain(2)
    seen = []
    for _ in range(4):
        seen.append(smiles(drawn))
        drawn = with_next_order(drawn, 0)
    assert seen == ["CC", "C=C", "C#C", "CC"]


@pytest.mark.parametrize("size", range(3, 9))
def test_ring_has_equal_sides_and_the_given_size(size: int) -> None:
    drawn = ring_at(EMPTY, (1.0, 2.0), size)
    lengths = [
        math.dist(drawn.atoms[bond.start].place, drawn.atoms[bond.end].place)
        for bond in drawn.bonds
    ]
    assert lengths == pytest.approx([1.0] * size)
    assert smiles(drawn) == "C1" + "C" * (size - 2) + "C1"
    assert centre(drawn, range(size)) == pytest.approx((1.0, 2.0))


def test_ring_of_nine_is_refused() -> None:
    with pytest.raises(ValueError, match="3 to 8, got 9"):
        ring_at(EMPTY, (0, 0), 9)


def test_benzene_comes_from_the_ring_and_naphthalene_from_each_of_its_bonds() -> None:
    benzene = ring_at(EMPTY, (0, 0), 6, is_aromatic=True)
    assert smiles(benzene) == "c1ccccc1"
    for bond in range(6):
        naphthalene = ring_on_bond(benzene, bond, 6, is_aromatic=True)
        assert smiles(naphthalene) == "c1ccc2ccccc2c1"
        assert len(naphthalene.atoms) == 10


def test_third_ring_gives_anthracene_phenanthrene_and_perinaphthene_closes() -> None:
    benzene = ring_at(EMPTY, (0, 0), 6, is_aromatic=True)
    two = ring_on_bond(benzene, 0, 6, is_aromatic=True)
    found = {
        smiles(ring_on_bond(two, bond, 6, is_aromatic=True)) for bond in (1, 2, 3, 4, 5)
    }
    assert {"c1ccc2cc3ccccc3cc2c1", "c1ccc2c(c1)ccc1ccccc12"} <= found
    # The two bonds beside the shared one close a ring in the bay: 13 carbons.
    assert all(one.lower().count("c") in (13, 14) for one in found)


def test_saturated_rings_fuse_outside_and_hang_where_there_is_no_room() -> None:
    benzene = ring_at(EMPTY, (0, 0), 6, is_aromatic=True)
    assert smiles(ring_on_bond(benzene, 0, 5)) == "c1ccc2c(c1)CCC2"
    assert smiles(ring_on_atom(benzene, 0, 6)) == "c1ccc(C2CCCCC2)cc1"
    assert smiles(ring_on_atom(chain(2), 1, 6, is_aromatic=True)) == "Cc1ccccc1"
    assert smiles(ring_on_atom(ring_at(EMPTY, (0, 0), 5), 0, 3)) == "C1CCC2(C1)CC2"


def test_element_charge_and_isotope_say_what_they_change() -> None:
    drawn = with_element(chain(3), 2, "O")
    assert smiles(drawn) == "CCO"
    assert smiles(with_charge(drawn, 2, -1)) == "CC[O-]"
    assert smiles(with_charge(with_element(drawn, 2, "N"), 2, 1)) == "CC[NH3+]"
    assert smiles(with_element(drawn, 2, "D")) == "[2H]CC"
    assert smiles(with_next_isotope(drawn, 0)) == "[13CH3]CO"
    charged = with_charge(drawn, 2, 9)
    assert charged.atoms[2].charge == 4
    assert with_element(charged, 2, "N").atoms[2].charge == 0


def alanine(wedge_to_methyl: bool) -> Drawing:
    """L-alanine drawn flat: COOH right, NH2 left, CH3 up, H implied."""
    return Drawing(
        atoms=(
            Atom(x=0, y=0),
            Atom(x=0.87, y=-0.5),
            Atom(x=-0.87, y=-0.5, element="N"),
            Atom(x=0, y=1),
            Atom(x=0.87, y=-1.5, element="O"),
            Atom(x=1.73, y=0, element="O"),
        ),
        bonds=(
            Bond(start=0, end=1),
            Bond(start=0, end=2),
            Bond(start=0, end=3, wedge="wedge" if wedge_to_methyl else "hash"),
            Bond(start=1, end=4, order=2),
            Bond(start=1, end=5),
        ),
    )


def test_wedge_gives_the_cip_label_seen_from_the_front() -> None:
    # Priorities N > COOH > CH3 > H. With the methyl towards the eye, H points
    # away; N (left), COOH (right), CH3 (up) run anticlockwise: S.
    assert smiles(alanine(True)) == "C[C@H](N)C(=O)O"
    assert smiles(alanine(False)) == "C[C@@H](N)C(=O)O"


def test_wedge_turned_round_or_made_wavy_says_nothing_of_the_centre() -> None:
    drawn = alanine(True)
    assert smiles(turned_round(drawn, 2)) == "CC(N)C(=O)O"
    marks = []
    plain = alanine(True)
    for _ in range(4):
        marks.append(plain.bonds[2].wedge)
        plain = with_next_wedge(plain, 2)
    assert marks == ["wedge", "hash", "either", ""]


def test_wedge_starts_at_the_atom_with_more_neighbours() -> None:
    grown = sprouted(chain(3), 1)
    index = grown.drawing.bond_between(1, 3)
    assert index is not None
    backwards = replace(
        grown.drawing,
        bonds=tuple(
            replace(bond, start=3, end=1) if i == index else bond
            for i, bond in enumerate(grown.drawing.bonds)
        ),
    )
    assert with_next_wedge(backwards, index).bonds[index].start == 1
    assert wedged_between(backwards, 1, 3).bonds[index].wedge == "wedge"


def test_double_bond_geometry_is_read_from_the_places() -> None:
    drawn = with_order(chain(4), 1, 2)
    assert smiles(drawn) == "C/C=C/C"
    crossed = with_next_wedge(drawn, 1)
    assert smiles(crossed) == "CC=CC"


def test_deleting_an_atom_takes_its_bonds_and_renumbers() -> None:
    drawn = with_element(chain(5), 4, "O")
    assert smiles(without(drawn, atoms=(2,))) == "CC.CO"
    assert smiles(without(drawn, bonds=(0,))) == "C.CCCO"
    assert smiles(part(drawn, {3, 4})) == "CO"


def test_moving_and_turning_keep_the_structure_and_its_lengths() -> None:
    drawn = alanine(True)
    everything = range(len(drawn.atoms))
    turned = rotated(moved(drawn, everything, (3, -2)), everything, 1.0, (1, 1))
    assert smiles(turned) == smiles(drawn)
    for bond in drawn.bonds:
        before = math.dist(drawn.atoms[bond.start].place, drawn.atoms[bond.end].place)
        after = math.dist(turned.atoms[bond.start].place, turned.atoms[bond.end].place)
        assert after == pytest.approx(before)
    back = rotated(turned, everything, -1.0, (1, 1))
    assert back.atoms[4].place == pytest.approx((3.87, -3.5))


def test_atoms_dropped_on_others_become_one_with_them() -> None:
    benzene = ring_at(EMPTY, (0, 0), 6, is_aromatic=True)
    two = merged(benzene, with_element(chain(2), 1, "O"))
    assert smiles(two) == "CO.c1ccccc1"
    target, held = two.atoms[0], two.atoms[6]
    dropped = moved(two, {6, 7}, (target.x - held.x, target.y - held.y + 0.1))
    assert smiles(fused(dropped, {6, 7})) == "Oc1ccccc1"
    assert fused(two, {6, 7}) == two


def test_atom_that_was_there_keeps_its_element_and_place() -> None:
    drawn = with_element(merged(chain(2), chain(2)), 1, "O")
    target, held = drawn.atoms[1], drawn.atoms[2]
    by = (target.x - held.x + 0.1, target.y - held.y)
    made = fused(moved(with_element(drawn, 2, "N"), {2, 3}, by), {2, 3})
    assert smiles(made) == "COC"
    assert made.atoms[1].place == target.place


@pytest.mark.parametrize("orders", [(2, 1), (1, 2)])
def test_bonds_that_fall_together_become_one_of_the_higher_order(
    orders: tuple[int, int],
) -> None:
    drawn = merged(chain(2), chain(2))
    for index, order in enumerate(orders):
        drawn = with_order(drawn, index, order)
    by = (
        drawn.atoms[0].x - drawn.atoms[2].x,
        drawn.atoms[0].y - drawn.atoms[2].y,
    )
    assert smiles(fused(moved(drawn, {2, 3}, by), {2, 3})) == "C=C"


def test_merged_drawings_stand_apart() -> None:
    first, second = chain(4), ring_at(EMPTY, (0, 0), 6)
    both = merged(first, second)
    right = max(atom.x for atom in first.atoms)
    assert min(atom.x for atom in both.atoms[4:]) - right == pytest.approx(1.5)
    assert merged(EMPTY, first) == first


def test_drawing_refuses_bonds_to_nowhere_and_twice_between_a_pair() -> None:
    atoms = (Atom(x=0, y=0), Atom(x=1, y=0))
    with pytest.raises(ValueError, match="names atom 2"):
        Drawing(atoms=atoms, bonds=(Bond(start=0, end=2),))
    with pytest.raises(ValueError, match="two bonds join"):
        Drawing(atoms=atoms, bonds=(Bond(start=0, end=1), Bond(start=1, end=0)))
    with pytest.raises(ValueError, match="order must be 1, 2 or 3"):
        Bond(start=0, end=1, order=4)


def test_functions_leave_their_input_as_it_was() -> None:
    drawn = alanine(True)
    kept = replace(drawn)
    with_element(drawn, 0, "N")
    without(drawn, atoms=(0, 1))
    ring_on_bond(drawn, 0, 6)
    fused(moved(drawn, {0}, (0.87, -0.5)), {0})
    assert drawn == kept


def test_hits_prefer_the_nearest_atom_and_leave_bond_ends_to_atoms() -> None:
    drawn = chain(3)
    assert drawn.atom_at((0.1, 0.0)) == 0
    assert drawn.atom_at((0.43, 0.25)) is None
    assert drawn.bond_at((0.43, 0.25)) == 0
    assert drawn.bond_at((0.05, 0.03)) is None
    assert free_angle_rad(drawn, 1) == pytest.approx(math.pi / 2)
