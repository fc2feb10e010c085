"""A structure as the user gave it, kept as text so that it can be frozen and saved."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Structure:
    """One claimed structure; heavy atoms keep the order in which they were given.

    Attributes
    ----------
    given : str
        SMILES or file name as the user wrote it.
    molblock : str
        V3000 molfile text of the heavy atoms (explicit H removed unless they
        carry an isotope), in the given order, with wedges where stereo is known.
    smiles : str
        Isomeric SMILES, canonical.
    name : str or None
    locants : tuple of (str or None)
        One per heavy atom; from the file or from clicks, None where unknown.
    """

    given: str
    molblock: str
    smiles: str
    name: str | None = None
    locants: tuple[str | None, ...] = ()
