"""The structure drawing with one tag a claim, as SVG."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from rdkit import Chem
from rdkit.Chem import rdDepictor
from rdkit.Chem.Draw import rdMolDraw2D

from spinledger.report.palette import INK
from spinledger.report.svg import Canvas, text_width
from spinledger.report.words import label_glyphs
from spinledger.structure.read import molecule
from spinledger.values.ledger import Entry, Ledger
from spinledger.values.structure import Structure

Point = tuple[float, float]
_SIZE = 10.5
_MARK = 8.0
_TAG_HEIGHT = 13.0
# Tags further out than this would no longer be read with their atom.
_REACHES = (15.0, 20.0, 26.0, 34.0, 44.0, 56.0)
_N_DIRECTIONS = 24
_OUTER_TAGS = re.compile(r"<\?xml[^>]*>|<!--.*?-->|</?svg[^>]*>|<rect[^>]*>\s*</rect>")
_CLASS = re.compile(r"\s+class='[^']*'")


@dataclass(frozen=True, slots=True, kw_only=True)
class _Tag:
    """A label to be put near an atom."""

    atom: int
    words: str
    state: str

    @property
    def width(self) -> float:
        """Mark, blank and text."""
        return _MARK + 3 + text_width(self.words, _SIZE)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Box:
    """A rectangle that is taken."""

    left: float
    top: float
    right: float
    bottom: float

    def overlap(self, other: _Box) -> float:
        """Shared area."""
        wide = min(self.right, other.right) - max(self.left, other.left)
        high = min(self.bottom, other.bottom) - max(self.top, other.top)
        return max(wide, 0.0) * max(high, 0.0)


def sketch_svg(ledger: Ledger, *, width: float = 300.0, height: float = 190.0) -> str:
    """Structure with a state mark and the label of every claim beside its atoms.

    Parameters
    ----------
    ledger : Ledger
    width, height : float
        Room for drawing and tags.

    Returns
    -------
    str
        SVG text.
    """
    drawn = drawable(ledger.structure)
    scale = 1.0 + 0.012 * max(0, len(ledger.entries) - 12)
    width, height = width * min(scale, 1.4), height * min(scale, 1.6)
    # Crowded structures get longer bonds, so that tags find room between them.
    bond_length = min(38.0, 26.0 + 0.6 * len(ledger.entries))
    skeleton, points = _skeleton(drawn, width, height, bond_length=bond_length)
    name = ledger.structure.name or ledger.structure.smiles
    canvas = Canvas(width, height, title=f"Structure of {name}", scope="sketch")
    canvas.add(f"<g>{skeleton}</g>")
    taken = _occupied(drawn, points)
    for tag in _tags(ledger.entries):
        box = _place(tag, points, taken, (width, height))
        taken.append((box, 4.0))
        middle = (box.top + box.bottom) / 2
        canvas.mark((box.left + _MARK / 2, middle), tag.state, size=_MARK)
        canvas.text(
            (box.left + _MARK + 3, middle + 0.35 * _SIZE),
            tag.words,
            size=_SIZE,
            weight=600,
        )
    return canvas.svg()


def plain_sketch_svg(structure: Structure, *, width: float, height: float) -> str:
    """Structure alone, as SVG text."""
    skeleton, _ = _skeleton(drawable(structure), width, height, padding=0.05)
    canvas = Canvas(
        width, height, title=f"Structure {structure.smiles}", scope="structure"
    )
    canvas.add(f"<g>{skeleton}</g>")
    return canvas.svg()


def drawable(structure: Structure) -> Chem.Mol:
    """Molecule in the given atom order with flat coordinates.

    Raises
    ------
    StructureError
        If the stored molfile text is damaged.
    """
    drawn = molecule(structure)
    if not _has_layout(drawn):
        rdDepictor.Compute2DCoords(drawn)
    return drawn


def _has_layout(drawn: Chem.Mol) -> bool:
    if drawn.GetNumConformers() == 0:
        return False
    positions = drawn.GetConformer().GetPositions()
    return len(positions) < 2 or bool((positions.max(0) - positions.min(0)).max() > 0.1)


def _skeleton(
    drawn: Chem.Mol,
    width: float,
    height: float,
    *,
    padding: float = 0.17,
    bond_length: float = 26.0,
) -> tuple[str, list[Point]]:
    """Markup of atoms and bonds, and where each atom stands."""
    drawer = rdMolDraw2D.MolDraw2DSVG(round(width), round(height))
    options: Any = drawer.drawOptions()
    options.useBWAtomPalette()
    options.clearBackground = False
    options.padding = padding
    options.bondLineWidth = 1.3
    options.fixedBondLength = bond_length
    options.minFontSize = 11
    options.maxFontSize = 12
    options.addStereoAnnotation = False
    prepared = rdMolDraw2D.PrepareMolForDrawing(drawn, kekulize=True)
    drawer.DrawMolecule(prepared)
    drawer.FinishDrawing()
    points = []
    for index in range(drawn.GetNumAtoms()):
        place = drawer.GetDrawCoords(index)
        points.append((float(place.x), float(place.y)))
    return _clean(drawer.GetDrawingText()), points


def _clean(markup: str) -> str:
    """Markup without header, background and names of RDKit's own."""
    inner = _CLASS.sub("", _OUTER_TAGS.sub("", markup))
    return inner.replace("#000000", INK).strip()


def _tags(entries: Sequence[Entry]) -> list[_Tag]:
    return [
        _Tag(atom=entry.atoms[0], words=label_glyphs(entry.claim), state=entry.state)
        for entry in entries
        if entry.atoms and entry.species == 0
    ]


def _occupied(drawn: Chem.Mol, points: Sequence[Point]) -> list[tuple[_Box, float]]:
    """Boxes of atom labels and along the bonds, each with how bad a hit is."""
    taken: list[tuple[_Box, float]] = []
    for atom in drawn.GetAtoms():
        point = points[atom.GetIdx()]
        if atom.GetSymbol() == "C" and atom.GetDegree() > 0:
            taken.append((_around(point, 3.0), 3.0))
        else:  # its symbol, and hydrogens on either side
            half = 9.0 if atom.GetTotalNumHs() == 0 else 18.0
            taken.append((_around(point, 8.0, across=half), 3.0))
    for bond in drawn.GetBonds():
        start = points[bond.GetBeginAtomIdx()]
        end = points[bond.GetEndAtomIdx()]
        for step in range(1, 8):
            share = step / 8
            middle = (
                start[0] + share * (end[0] - start[0]),
                start[1] + share * (end[1] - start[1]),
            )
            taken.append((_around(middle, 2.5), 3.0))
    return taken


def _place(
    tag: _Tag,
    points: Sequence[Point],
    taken: Sequence[tuple[_Box, float]],
    size: Point,
) -> _Box:
    """Nearest free place around an atom; where all are taken, the least bad."""
    if tag.atom >= len(points):
        return _tag_box(tag, (size[0] / 2, size[1] / 2))
    atom = points[tag.atom]
    best, best_cost = _tag_box(tag, atom), math.inf
    for reach in _REACHES:
        for step in range(_N_DIRECTIONS):
            angle = 2 * math.pi * step / _N_DIRECTIONS
            box = _tag_box(
                tag,
                (
                    atom[0] + math.cos(angle) * (reach + 0.4 * tag.width),
                    atom[1] + math.sin(angle) * reach,
                ),
            )
            cost = (
                0.35 * reach
                + _cost(box, taken, size)
                + _confusion(box, tag.atom, points)
            )
            if cost < best_cost:
                best, best_cost = box, cost
    return best


def _cost(box: _Box, taken: Sequence[tuple[_Box, float]], size: Point) -> float:
    hits = sum(weight * box.overlap(other) for other, weight in taken)
    outside = (
        max(0.0, -box.left)
        + max(0.0, -box.top)
        + max(0.0, box.right - size[0])
        + max(0.0, box.bottom - size[1])
    )
    return hits + 400 * outside


def _confusion(box: _Box, atom: int, points: Sequence[Point]) -> float:
    """Penalty where a tag stands nearer to another atom than to its own."""
    own = _distance(box, points[atom])
    nearer = sum(
        max(0.0, own + 5.0 - _distance(box, point))
        for index, point in enumerate(points)
        if index != atom
    )
    return 6.0 * nearer


def _distance(box: _Box, point: Point) -> float:
    sideways = max(box.left - point[0], 0.0, point[0] - box.right)
    upright = max(box.top - point[1], 0.0, point[1] - box.bottom)
    return math.hypot(sideways, upright)


def _tag_box(tag: _Tag, centre: Point) -> _Box:
    return _Box(
        left=centre[0] - tag.width / 2,
        right=centre[0] + tag.width / 2,
        top=centre[1] - _TAG_HEIGHT / 2,
        bottom=centre[1] + _TAG_HEIGHT / 2,
    )


def _around(point: Point, half: float, *, across: float | None = None) -> _Box:
    wide = half if across is None else across
    return _Box(
        left=point[0] - wide,
        right=point[0] + wide,
        top=point[1] - half,
        bottom=point[1] + half,
    )
