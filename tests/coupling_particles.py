"""Particles written by hand, so that topicity is not part of what is tested."""

from collections.abc import Sequence
from dataclasses import dataclass

from rdkit import Chem

from spinledger.prediction.couplings import predict_couplings
from spinledger.values.claim import CouplingClaim, Particle

NUCLEI = {1: "1H", 9: "19F", 15: "31P"}

#: A particle: heavy atom and which of its hydrogens, None for all of them.
Spec = tuple[int, int | None]


@dataclass(frozen=True)
class Predicted:
    """Couplings of one molecule with ways to ask for them."""

    couplings: tuple[CouplingClaim, ...]
    particles: tuple[Particle, ...]

    def between(self, first: int, second: int) -> CouplingClaim:
        """The coupling of two particles."""
        found = [
            c
            for c in self.couplings
            if (first, second) in c.pairs or (second, first) in c.pairs
        ]
        assert len(found) == 1, f"{len(found)} couplings between {first} and {second}"
        return found[0]

    def has(self, first: int, second: int) -> bool:
        """Whether the two particles couple at all."""
        return any(
            (first, second) in c.pairs or (second, first) in c.pairs
            for c in self.couplings
        )

    def of_kind(self, kind: str) -> list[CouplingClaim]:
        """All couplings of a kind."""
        return [c for c in self.couplings if c.kind == kind]


def predict(
    smiles: str,
    claims: Sequence[Sequence[Spec]],
    *,
    hetero: Sequence[int] = (),
    is_aqueous: bool = True,
) -> Predicted:
    """Predict from SMILES and claims; each claim is a list of particles."""
    mol = Chem.AddHs(Chem.MolFromSmiles(smiles))
    particles = []
    for claim, members in enumerate(claims):
        for heavy, which in members:
            found = tuple(
                n.GetIdx()
                for n in mol.GetAtomWithIdx(heavy).GetNeighbors()
                if n.GetAtomicNum() == 1
            )
            chosen = found if which is None else (found[which],)
            particles.append(
                Particle(
                    claim=claim,
                    nucleus="1H",
                    n_spins=len(chosen),
                    hydrogens=chosen,
                )
            )
    for atom in hetero:
        nucleus = NUCLEI[mol.GetAtomWithIdx(atom).GetAtomicNum()]
        particles.append(
            Particle(claim=None, nucleus=nucleus, n_spins=1, hydrogens=(atom,))
        )
    couplings = predict_couplings(mol, tuple(particles), is_aqueous=is_aqueous)
    return Predicted(couplings=couplings, particles=tuple(particles))
