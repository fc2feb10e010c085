"""Further measurements that would tell the contenders apart, best first.

Each is simulated from the fits at hand: what a correlation or a carbon count
would show if the claimed structure, or if the contender, were right.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Sequence

from rdkit import Chem

from spinledger.reconcile.evaluate import Evaluation
from spinledger.reconcile.solve import Limits
from spinledger.structure.read import molecule
from spinledger.values.ledger import Advice

Pair = tuple[float, float]
Named = tuple[str, Evaluation]

SAME_SHIFT_PPM = 0.03
VISIBLE_COSY_HZ = 1.5
# How far each experiment is to be trusted when it does differ: a carbon count
# is plain, a cross peak can hide on the diagonal [common practice].
TRUST = {"13C": 0.95, "HSQC": 0.9, "COSY": 0.8, "decoupling": 0.7, "D2O": 0.6}


def advise(
    own: Evaluation, others: Sequence[Named], limits: Limits
) -> tuple[Advice, ...]:
    """Measurements ranked by how many standing contenders they would separate.

    Parameters
    ----------
    own : Evaluation
        Of the claimed structure.
    others : sequence of (name, Evaluation)
        Contenders that are not excluded.
    limits : Limits
        Let the user stop.
    """
    if not others or own.solution is None:
        return ()
    probes: tuple[tuple[str, str, Callable[[Evaluation, Evaluation], str]], ...] = (
        ("13C", "13C with DEPT", _carbon_difference),
        ("HSQC", "edited HSQC", _carrier_difference),
        ("COSY", "COSY", _cosy_difference),
        ("decoupling", "homodecoupling", _decoupling_difference),
        ("D2O", "D2O shake", _shake_difference),
    )
    rows = []
    for key, name, probe in probes:
        limits.checked()
        found = [(other, probe(own, evaluation)) for other, evaluation in others]
        telling = [(other, text) for other, text in found if text]
        if not telling:
            continue
        share = len(telling) / len(others)
        rows.append(
            Advice(
                measurement=name,
                expected_discrimination=TRUST[key] * share,
                look_for=f"against {telling[0][0]}: {telling[0][1]}",
            )
        )
    rows += _hidden_advice(own)
    return tuple(sorted(rows, key=lambda row: -row.expected_discrimination))


def carbon_types(evaluation: Evaluation) -> Counter[int]:
    """Distinct carbon atoms by their number of protons (as DEPT shows them).

    Carbons with protons count by their claims, so that diastereotopic groups
    are told apart; the others by the symmetry of the drawing.
    """
    mol = molecule(evaluation.structure)
    ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False))
    seen: dict[tuple[int, ...], int] = {}
    for claim in evaluation.claims.claims:
        atoms = [mol.GetAtomWithIdx(i) for i in claim.atoms if i < mol.GetNumAtoms()]
        if claim.species == 0 and atoms and atoms[0].GetSymbol() == "C":
            seen[claim.atoms] = int(atoms[0].GetTotalNumHs())
    for rank, atom in zip(ranks, mol.GetAtoms(), strict=True):
        if atom.GetSymbol() == "C" and atom.GetTotalNumHs() == 0:
            seen[-1 - rank,] = 0
    return Counter(seen.values())


def _carbon_difference(own: Evaluation, other: Evaluation) -> str:
    mine, theirs = carbon_types(own), carbon_types(other)
    if mine == theirs:
        return ""
    return (
        f"{_carbon_words(mine)} if the structure is right, {_carbon_words(theirs)} "
        "if the contender is"
    )


def _carbon_words(types: Counter[int]) -> str:
    names = {3: "CH3", 2: "CH2", 1: "CH", 0: "C"}
    parts = [
        f"{types[n]} {names.get(n, f'CH{n}')}" for n in sorted(types, reverse=True)
    ]
    return f"{sum(types.values())} carbon lines ({', '.join(parts)})"


def _places(evaluation: Evaluation) -> dict[int, float]:
    """Fitted shift of every placed claim that does not exchange, ppm."""
    solution = evaluation.solution
    if solution is None:
        return {}
    left_out = solution.absent | solution.hidden
    return {
        index: float(solution.best.refinement.shifts_ppm[index])
        for index, claim in enumerate(evaluation.claims.claims)
        if index not in left_out and not claim.is_exchangeable
    }


def _carriers(evaluation: Evaluation) -> dict[float, int]:
    """Protons on the carrier of each placed claim, by fitted shift."""
    mol = molecule(evaluation.structure)
    found = {}
    for index, shift in _places(evaluation).items():
        claim = evaluation.claims.claims[index]
        if claim.atoms and claim.species == 0 and claim.atoms[0] < mol.GetNumAtoms():
            found[shift] = int(mol.GetAtomWithIdx(claim.atoms[0]).GetTotalNumHs())
    return found


def _carrier_difference(own: Evaluation, other: Evaluation) -> str:
    theirs = _carriers(other)
    names = {1: "CH", 2: "CH2", 3: "CH3"}
    for shift, n_protons in sorted(_carriers(own).items()):
        near = [n for place, n in theirs.items() if abs(place - shift) < SAME_SHIFT_PPM]
        if near and n_protons not in near:
            return (
                f"the carbon under {shift:.2f} ppm is {names.get(n_protons, 'CH')} if "
                f"the structure is right, {names.get(near[0], 'CH')} if the "
                "contender is"
            )
    return ""


def _correlations(evaluation: Evaluation) -> set[Pair]:
    """Pairs of fitted shifts whose claims couple visibly over two or three bonds."""
    solution = evaluation.solution
    if solution is None:
        return set()
    places = _places(evaluation)
    pairs = set()
    for coupling, j_hz in zip(
        evaluation.claims.couplings,
        solution.best.refinement.couplings_hz,
        strict=True,
    ):
        owners = [evaluation.claims.particles[p].claim for p in coupling.pairs[0]]
        if abs(float(j_hz)) < VISIBLE_COSY_HZ or owners[0] == owners[1]:
            continue
        shifts = [places[o] for o in owners if o is not None and o in places]
        if len(shifts) == 2:
            pairs.add((max(shifts), min(shifts)))
    return pairs


def _only_in(first: set[Pair], second: set[Pair]) -> list[Pair]:
    return sorted(
        pair
        for pair in first
        if abs(pair[0] - pair[1]) > SAME_SHIFT_PPM
        and not any(
            abs(pair[0] - other[0]) < SAME_SHIFT_PPM
            and abs(pair[1] - other[1]) < SAME_SHIFT_PPM
            for other in second
        )
    )


def _cosy_difference(own: Evaluation, other: Evaluation) -> str:
    mine, theirs = _correlations(own), _correlations(other)
    for pair in _only_in(mine, theirs):
        return (
            f"a cross peak between {pair[0]:.2f} and {pair[1]:.2f} ppm only if the "
            "structure is right"
        )
    for pair in _only_in(theirs, mine):
        return (
            f"a cross peak between {pair[0]:.2f} and {pair[1]:.2f} ppm only if the "
            "contender is right"
        )
    return ""


def _decoupling_difference(own: Evaluation, other: Evaluation) -> str:
    mine, theirs = _correlations(own), _correlations(other)
    for pair in _only_in(mine, theirs):
        return (
            f"irradiated at {pair[0]:.2f} ppm, the signal at {pair[1]:.2f} ppm loses "
            "a splitting only if the structure is right"
        )
    return ""


def _shake_difference(own: Evaluation, other: Evaluation) -> str:
    """Signals that lose a splitting when OH or NH exchange away."""
    mine, theirs = _losers(own), _losers(other)
    for shift in sorted(mine):
        if not any(abs(shift - place) < SAME_SHIFT_PPM for place in theirs):
            return (
                f"the signal at {shift:.2f} ppm loses a splitting only if the "
                "structure is right"
            )
    return ""


def _losers(evaluation: Evaluation) -> set[float]:
    solution = evaluation.solution
    places = _places(evaluation)
    found: set[float] = set()
    if solution is None:
        return found
    for coupling in evaluation.claims.couplings:
        owners = [evaluation.claims.particles[p].claim for p in coupling.pairs[0]]
        exchanging = [
            owner
            for owner in owners
            if owner is not None
            and evaluation.claims.claims[owner].is_exchangeable
            and owner not in solution.absent
        ]
        if exchanging and abs(coupling.j_hz) > VISIBLE_COSY_HZ:
            found |= {places[o] for o in owners if o is not None and o in places}
    return found


def _hidden_advice(own: Evaluation) -> list[Advice]:
    """Another solvent or temperature where claims lie under water or solvent."""
    if own.solution is None or not own.solution.hidden:
        return []
    labels = [own.claims.claims[index].label for index in sorted(own.solution.hidden)]
    counted = [claim for claim in own.claims.claims if claim.visibility == "seen"]
    share = len(labels) / max(len(counted), 1)
    return [
        Advice(
            measurement="another temperature or solvent",
            expected_discrimination=0.3 * share,
            look_for=f"{', '.join(labels)} should come out from under the masked line",
        )
    ]
