"""Claims of whole structures: counts, visibility, species, particles, couplings."""

import numpy as np
import pytest

from spinledger.prediction.claims import make_claims, species_models
from spinledger.structure.mobility import merging_barrier_kcal
from spinledger.structure.read import read_structure
from spinledger.values.claim import Claim, ClaimSet


def claims_of(smiles: str, solvent: str | None, **conditions: float) -> ClaimSet:
    return make_claims(read_structure(smiles), solvent=solvent, **conditions)


def seen(claims: ClaimSet) -> list[Claim]:
    return [claim for claim in claims.claims if claim.visibility == "seen"]


def labels_of_pair(claims: ClaimSet, pair: tuple[int, int]) -> frozenset[str]:
    names = []
    for index in pair:
        claim = claims.particles[index].claim
        nucleus = claims.particles[index].nucleus
        names.append(nucleus if claim is None else claims.claims[claim].label)
    return frozenset(names)


STRUCTURES = [
    ("CCO", "CDCl3"),
    ("N[C@@H](CC(=O)O)C(=O)O", "D2O"),
    ("OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O", "D2O"),
    ("C/C=C/C(=O)OCC", "CDCl3"),
    ("CN(C)C=O", "DMSO-d6"),
    ("OCC(O)CO", "D2O"),
    ("Fc1ccc(C(C)N)cc1", "CDCl3"),
    ("COP(=O)(OC)CC(=O)OC", "CDCl3"),
    ("CC(=O)C(=O)O", "D2O"),
    ("CCN(CC)CC.OC(=O)C(F)(F)F", "CDCl3"),
    ("[2H]C([2H])([2H])OC(=O)c1ccccc1", "CDCl3"),
    ("CC(=O)NCC(=O)N", "DMSO-d6"),
]


@pytest.mark.parametrize(("smiles", "solvent"), STRUCTURES)
def test_claims_are_consistent_in_themselves(smiles: str, solvent: str) -> None:
    structure = read_structure(smiles)
    claims = make_claims(structure, solvent=solvent)
    models = species_models(structure, solvent=solvent)
    labels = [claim.label for claim in claims.claims]
    assert len(set(labels)) == len(labels)
    assert len(claims.species_smiles) == len(claims.species_shares) == len(models)
    for claim in claims.claims:
        assert claim.shift_sd_ppm > 0
        assert claim.visibility == "seen" or claim.why.endswith(".")
        if claim.pair is not None:
            twin = claims.claims[claims.index_of(claim.pair)]
            assert twin.pair == claim.label
            assert twin.atoms == claim.atoms
    covered = {p.claim for p in claims.particles if p.claim is not None}
    visible = {
        i for i, claim in enumerate(claims.claims) if claim.visibility != "silent"
    }
    assert covered == visible
    for index in visible:
        spins = [p for p in claims.particles if p.claim == index]
        claim = claims.claims[index]
        assert sum(p.n_spins for p in spins) == claim.n_protons
        full = models[claim.species]
        carriers = {
            full.GetAtomWithIdx(h).GetNeighbors()[0].GetIdx()
            for p in spins
            for h in p.hydrogens
        }
        assert carriers == set(claim.atoms)
    for number, coupling in enumerate(claims.couplings):
        assert all(
            0 <= i < len(claims.particles) for pair in coupling.pairs for i in pair
        )
        assert coupling.swaps_with is None or (
            claims.couplings[coupling.swaps_with].swaps_with == number
        )


@pytest.mark.parametrize(
    ("smiles", "solvent", "protons"),
    [
        # Protons on carbon, counted from the formula by hand.
        ("N[C@@H](CC(=O)O)C(=O)O", "D2O", 3),
        ("CCO", "CD3OD", 5),
        ("Cn1c(=O)c2c(ncn2C)n(C)c1=O", "D2O", 10),
        ("NCCc1ccc(O)c(O)c1", "D2O", 7),
        ("CC(=O)Oc1ccccc1C(=O)O", "CDCl3", 7),
        ("C=C(C)[C@@H]1CC=C(C)C(=O)C1", "CDCl3", 14),
    ],
)
def test_seen_protons_are_those_on_carbon(
    smiles: str, solvent: str, protons: int
) -> None:
    assert sum(c.n_protons for c in seen(claims_of(smiles, solvent))) == protons


def test_solvent_is_known_by_any_name() -> None:
    by_alias = claims_of("CCO", "methanol-d4")
    assert by_alias.claims == claims_of("CCO", "CD3OD").claims
    assert [c.visibility for c in by_alias.claims] == ["seen", "seen", "silent"]


def test_zwitterion_is_claimed_and_said_in_water() -> None:
    claims = claims_of("N[C@@H](CC(=O)O)C(=O)O", "D2O")
    assert claims.species_smiles == ("[NH3+][C@@H](CC(=O)[O-])C(=O)[O-]",)
    assert any("pH 7.4" in note for note in claims.notes)
    acid = claims_of("N[C@@H](CC(=O)O)C(=O)O", "D2O", ph=0.5)
    assert acid.species_smiles == ("[NH3+][C@@H](CC(=O)O)C(=O)O",)


def test_anomers_are_two_species_on_the_same_atoms() -> None:
    claims = claims_of("OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O", "D2O")
    for species in (0, 1):
        atoms = sorted(
            {a for c in seen(claims) if c.species == species for a in c.atoms}
        )
        assert atoms == [1, 2, 4, 6, 8, 10]
    # H1 of the alpha anomer is the lower-field one (equatorial proton).
    shift = {c.species: c.shift_ppm for c in seen(claims) if c.atoms == (4,)}
    assert shift[1] > shift[0]
    between = {
        frozenset(claims.claims[claims.particles[i].claim or 0].species for i in pair)
        for coupling in claims.couplings
        for pair in coupling.pairs
    }
    assert between == {frozenset({0}), frozenset({1})}


def test_anomeric_coupling_differs_between_the_anomers() -> None:
    """J(1,2) about 3.7 Hz in alpha, 8.0 Hz in beta glucose (textbook)."""
    claims = claims_of("OC[C@H]1O[C@@H](O)[C@H](O)[C@@H](O)[C@@H]1O", "D2O")
    found = {
        name: coupling.j_hz
        for coupling in claims.couplings
        for name in ("alpha", "beta")
        if labels_of_pair(claims, coupling.pairs[0])
        == {f"1-H ({name})", f"2-H ({name})"}
    }
    # 1.5 Hz: the error of a Karplus relation.
    assert found["alpha"] == pytest.approx(3.7, abs=1.5)
    assert found["beta"] == pytest.approx(8.0, abs=1.5)


def test_minor_hydrate_is_optional() -> None:
    claims = claims_of("CC(=O)C(=O)O", "D2O")
    assert {c.visibility for c in claims.claims if c.species == 1} == {"optional"}


def test_slow_amide_sides_are_claimed_apart_and_named() -> None:
    claims = claims_of("O=CN1CCCCC1", "CDCl3")
    assert sorted(c.n_protons for c in claims.claims) == [1, 2, 2, 2, 2, 2]
    assert any("formamide" in note for note in claims.notes)


def test_two_sites_of_dimethylformamide() -> None:
    claims = claims_of("CN(C)C=O", "CDCl3")
    assert sorted(c.n_protons for c in claims.claims) == [1, 3, 3]


def test_hydroxyl_couples_in_dmso_only() -> None:
    """OH in DMSO-d6 splits its CH; in CDCl3 it is left uncoupled."""

    def couples(solvent: str) -> bool:
        claims = claims_of("CC(O)C(F)(F)F", solvent)
        return any(
            any("OH" in label for label in labels_of_pair(claims, c.pairs[0]))
            for c in claims.couplings
        )

    assert couples("DMSO-d6")
    assert not couples("CDCl3")


def test_fluorine_is_a_particle_without_a_claim() -> None:
    claims = claims_of("OCC(F)(F)F", "CDCl3")
    (fluorine,) = (p for p in claims.particles if p.nucleus == "19F")
    assert fluorine.claim is None
    assert fluorine.n_spins == 3
    kinds = [
        abs(c.j_hz)
        for c in claims.couplings
        if "19F" in labels_of_pair(claims, c.pairs[0])
    ]
    assert max(kinds) == pytest.approx(9.0, abs=3.0)  # 3J(HF) of CF3CH2O, 8.8 Hz


def test_counterions_without_protons_claim_nothing() -> None:
    claims = claims_of("[Na+].[O-]C(=O)C", "D2O")
    assert [c.n_protons for c in claims.claims] == [3]


def test_counterions_with_protons_are_claims() -> None:
    claims = claims_of("CCN(CC)CC.OC(=O)/C=C/C(=O)O", "D2O")
    assert sorted(c.n_protons for c in seen(claims)) == [2, 6, 9]


def test_crystal_water_is_silent() -> None:
    claims = claims_of("CC(=O)[O-].[Na+].O", "D2O")
    water = next(c for c in claims.claims if c.atoms == (5,))
    assert water.visibility == "silent"
    assert "water" in water.why


def test_deuterium_claims_nothing() -> None:
    claims = claims_of("[2H]C([2H])([2H])OC(=O)c1ccccc1", "CDCl3")
    assert sum(c.n_protons for c in claims.claims) == 5
    assert any("Deuterium" in note for note in claims.notes)


def test_vinyl_protons_stand_in_the_right_order() -> None:
    """Methyl acrylate: trans-coupled 6.40, cis-coupled 5.82 ppm (handbook)."""
    claims = claims_of("C=CC(=O)OC", "CDCl3")
    lateral = {}
    for coupling in claims.couplings:
        names = labels_of_pair(claims, coupling.pairs[0])
        if coupling.bonds == 3 and "2-H" in names:
            (label,) = names - {"2-H"}
            lateral[label] = abs(coupling.j_hz)
    trans = max(lateral, key=lambda label: lateral[label])
    cis = min(lateral, key=lambda label: lateral[label])
    shift = {c.label: c.shift_ppm for c in claims.claims}
    assert shift[trans] > shift[cis]
    assert shift[trans] == pytest.approx(6.40, abs=0.25)
    assert shift[cis] == pytest.approx(5.82, abs=0.25)


def test_same_input_gives_the_same_numbers() -> None:
    first = claims_of("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O", "CDCl3")
    second = claims_of("CC(C)[C@@H]1CC[C@@H](C)C[C@H]1O ", "CDCl3")
    assert np.array_equal(
        [c.shift_ppm for c in first.claims], [c.shift_ppm for c in second.claims]
    )
    assert [c.j_hz for c in first.couplings] == [c.j_hz for c in second.couplings]


def test_open_configuration_is_said() -> None:
    notes = claims_of("CC(O)CC", "CDCl3").notes
    assert any("stereocentres open" in note for note in notes)


@pytest.mark.parametrize(
    ("smiles", "expected"),
    [
        ("CC(=O)N(C)Cc1ccccc1", True),
        ("CC(=O)N1CCCC1C(=O)O", True),
        ("CN(C)C=O", False),  # two like groups: two sites, not two rotamers
        ("CC(=O)NC", False),  # secondary amides are nearly all trans
    ],
)
def test_rotamers_are_said(smiles: str, expected: bool) -> None:
    notes = claims_of(smiles, "CDCl3").notes
    assert any("rotamers" in note for note in notes) is expected


def test_methylene_of_a_chiral_ester_is_two_claims_that_may_coincide() -> None:
    """Ethyl lactate: OCH2 is diastereotopic, and looks like "2H, q"."""
    claims = claims_of("CCOC(=O)[C@H](C)O", "CDCl3")
    high, low = (c for c in claims.claims if c.atoms == (1,))
    assert high.n_protons == low.n_protons == 1
    assert high.pair == low.label
    # They may coincide: the distance is within one sd of each.
    assert abs(high.shift_ppm - low.shift_ppm) < high.shift_sd_ppm


def test_ammonium_is_said_to_be_a_triplet_by_nitrogen() -> None:
    claims = claims_of("[NH4+].[Cl-]", "DMSO-d6")
    (claim,) = claims.claims
    assert claim.n_protons == 4
    assert claim.is_exchangeable
    assert any("1:1:1" in note and "51 Hz" in note for note in claims.notes)


@pytest.mark.parametrize(
    ("smiles", "atom", "low_ppm", "high_ppm"),
    [
        # Ethylamine in D2O (pH titrations, from memory): CH2 2.65 free, 3.07 as ion.
        ("CCN", 1, 0.25, 0.7),
        # Glycine: 3.18 at pH 12, 3.56 at pH 7.
        ("NCC(=O)O", 1, 0.15, 0.7),
    ],
)
def test_protonation_moves_the_alpha_protons_down(
    smiles: str, atom: int, low_ppm: float, high_ppm: float
) -> None:
    shifts = {}
    for ph in (7.0, 12.5):
        claims = claims_of(smiles, "D2O", ph=ph)
        (shifts[ph],) = (c.shift_ppm for c in claims.claims if c.atoms == (atom,))
    assert low_ppm < shifts[7.0] - shifts[12.5] < high_ppm


@pytest.mark.parametrize(
    ("smiles", "words"),
    [
        ("C[Si](C)(C)CCO", "29Si"),
        ("C[Sn](C)(C)C", "119Sn"),
        ("C[Se]C", "77Se"),
        ("OB(O)c1ccccc1", "11B"),
        ("[2H]C([2H])([2H])OC", "Deuterium"),
        ("[Fe].CCO", "paramagnetic"),
        ("CN(C)C(=O)OC", "neither fast nor slow"),
    ],
)
def test_what_the_claims_leave_out_is_said(smiles: str, words: str) -> None:
    assert any(words in note for note in claims_of(smiles, "CDCl3").notes)


def test_plain_compounds_have_no_notes() -> None:
    assert claims_of("CCOC(C)=O", "CDCl3").notes == ()


def test_fading_methylene_says_what_is_left() -> None:
    claims = claims_of("CCOC(=O)CC(=O)OCC", "D2O")
    (claim,) = (c for c in claims.claims if c.atoms == (5,))
    assert claim.visibility == "optional"
    assert "1:1:1" in claim.why


def test_merging_barrier_is_the_closed_form() -> None:
    """k = 2.22 times the distance (40 Hz), Eyring at 298.15 K."""
    rate = 2.2214 * 40.0
    k_b, h, r = 1.380649e-23, 6.62607015e-34, 1.987204e-3
    expected = r * 298.15 * np.log(k_b * 298.15 / (h * rate))
    # 1e-3: digits of the constants.
    assert merging_barrier_kcal(298.15) == pytest.approx(expected, abs=1e-3)


def test_very_large_structures_are_claimed_without_a_model_in_space() -> None:
    """A chain of 200 atoms with a methyl group at each end, alike by symmetry."""
    claims = claims_of("C" + "O" * 198 + "C", "CDCl3")
    (claim,) = claims.claims
    assert claim.atoms == (0, 199)
    assert claim.n_protons == 6
