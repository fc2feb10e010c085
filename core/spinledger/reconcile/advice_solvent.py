"""The same compound in DMSO, where OH and NH show and split; J in Hz."""

from __future__ import annotations

from collections import Counter

import numpy as np

from spinledger.prediction.claims import make_claims
from spinledger.reconcile.advice_view import (
    RESOLVED_HZ,
    Finding,
    View,
    odds_of_chances,
    splittings_of,
)
from spinledger.reconcile.words import pattern
from spinledger.spins.multiplicity import multiplicity_of
from spinledger.structure.read import molecule
from spinledger.values.structure import Structure

SOLVENT = "DMSO-d6"
#: OH in DMSO is often, not always, sharp enough to show its splitting.
_SHOWS, _MISLEADS = 0.75, 0.25

Pattern = tuple[str, str]


def solvent_finding(own: View, other: View) -> Finding | None:
    """What OH and NH would look like in DMSO: a CHOH is a doublet, a CH2OH a triplet.

    Nothing for salts, and where the spectrum was taken in DMSO.
    """
    if own.evaluation.evidence.solvent == SOLVENT:
        return None
    mine, theirs = (
        exchangeable_patterns(one.evaluation.structure) for one in (own, other)
    )
    if mine is None or theirs is None or mine == theirs:
        return None
    return Finding(
        log_odds=odds_of_chances(_SHOWS, _MISLEADS),
        look_for=f"beyond the signals on carbon: {_words(mine)} if {own.name} is "
        f"right, {_words(theirs)} if {other.name} is",
    )


def exchangeable_patterns(structure: Structure) -> Counter[Pattern] | None:
    """Kind and predicted pattern of every OH, NH and SH in DMSO; None for a salt."""
    mol = molecule(structure)
    if any(atom.GetFormalCharge() for atom in mol.GetAtoms()):
        return None
    claims = make_claims(structure, solvent=SOLVENT)
    if len(claims.species_smiles) != 1 or "+" in claims.species_smiles[0]:
        return None
    couplings = np.array([one.j_hz for one in claims.couplings])
    splittings = splittings_of(claims, couplings)
    found: Counter[Pattern] = Counter()
    for index, claim in enumerate(claims.claims):
        if not claim.is_exchangeable or claim.visibility == "silent":
            continue
        symbol = mol.GetAtomWithIdx(claim.atoms[0]).GetSymbol()
        n_spins = sum(
            n
            for rows in splittings.get(index, {}).values()
            for j_hz, n in rows
            if j_hz >= RESOLVED_HZ
        )
        levels = [(n_spins, False)] if n_spins else []
        word = multiplicity_of(levels, is_first_order=True, spin_system=None)
        found[f"{symbol}H", pattern(word)] += claim.n_protons
    return found


def _words(patterns: Counter[Pattern]) -> str:
    if not patterns:
        return "nothing"
    parts = [
        f"{count} {kind}, {shape}" for (kind, shape), count in sorted(patterns.items())
    ]
    return " and ".join(parts)
