"""Writes a drawing as a V2000 molfile; coordinates in bond lengths.

References
----------
.. [1] A. Dalby et al., J. Chem. Inf. Comput. Sci. 32 (1992) 244-255,
   doi:10.1021/ci00007a012. Atom, bond and property lines; the counts of columns
   are given there.
"""

from __future__ import annotations

from collections.abc import Sequence

from spinledger_app.sketch.drawing import Atom, Bond, Drawing

_MOST_ATOMS = 999
_PER_LINE = 8
_SINGLE_MARKS = {"": 0, "wedge": 1, "either": 4, "hash": 6}
_DOUBLE_EITHER = 3


def molblock(drawing: Drawing) -> str:
    """Drawing as the text of a molfile, wedges as drawn.

    Raises
    ------
    ValueError
        If it has more than 999 atoms or bonds, the most the format can hold.
    """
    if max(len(drawing.atoms), len(drawing.bonds)) > _MOST_ATOMS:
        raise ValueError(
            f"drawing: at most {_MOST_ATOMS} atoms and bonds, got "
            f"{len(drawing.atoms)} and {len(drawing.bonds)}"
        )
    lines = ["", "  SpinLed                 2D", ""]
    lines.append(
        f"{len(drawing.atoms):3d}{len(drawing.bonds):3d}  0  0  1  0            999 V2000"
    )
    lines += [_atom_line(atom) for atom in drawing.atoms]
    lines += [_bond_line(bond) for bond in drawing.bonds]
    lines += _property_lines("CHG", [atom.charge for atom in drawing.atoms])
    lines += _property_lines("ISO", [atom.isotope for atom in drawing.atoms])
    return "\n".join([*lines, "M  END", ""])


def _atom_line(atom: Atom) -> str:
    place = f"{atom.x:10.4f}{atom.y:10.4f}{0:10.4f}"
    return f"{place} {atom.element:<3} 0  0  0  0  0  0  0  0  0{atom.locant:3d}  0  0"


def _bond_line(bond: Bond) -> str:
    if bond.order == 1:
        mark = _SINGLE_MARKS[bond.wedge]
    else:
        mark = _DOUBLE_EITHER if bond.wedge == "either" else 0
    return f"{bond.start + 1:3d}{bond.end + 1:3d}{bond.order:3d}{mark:3d}"


def _property_lines(name: str, values: Sequence[int]) -> list[str]:
    pairs = [f"{i + 1:4d}{value:4d}" for i, value in enumerate(values) if value]
    return [
        f"M  {name}{len(some):3d}{''.join(some)}"
        for some in (pairs[k : k + _PER_LINE] for k in range(0, len(pairs), _PER_LINE))
    ]
