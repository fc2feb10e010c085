"""NMReDATA records (version 1.1): an SD file with the assignment in its tags.

Shifts in ppm, couplings in Hz.

References
----------
.. [1] M. Pupier et al., Magn. Reson. Chem. 56 (2018) 703-715,
   doi:10.1002/mrc.4737 (tags, separators, digits).
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from rdkit import Chem, rdBase
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from spinledger import __version__
from spinledger.errors import FileError
from spinledger.report.sketch import drawable
from spinledger.report.text import signal_groups
from spinledger.report.words import plain
from spinledger.values.ledger import Entry, EntryCoupling, Ledger

UNKNOWN_SHIFT = 777.777
_END = "\\\n"
_QUOTED = re.compile(r"[,/\\|()&\s]")


class RecordError(FileError, ValueError):
    """A file is not an NMReDATA record, or cannot be read."""


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordAssignment:
    """One line of the assignment: label, shift, and atoms as counted from 1."""

    label: str
    shift_ppm: float | None
    atoms: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordCoupling:
    """One coupling between two labels, signed where it was known."""

    first: str
    second: str
    j_hz: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Record:
    """What a record says about a proton spectrum.

    Attributes
    ----------
    smiles : str
        Canonical SMILES of the structure in the record.
    tags : tuple of (str, str)
        Every NMREDATA tag as it stands, in order.
    assignments : tuple of RecordAssignment
    couplings : tuple of RecordCoupling
    field_mhz : float or None
    solvent : str or None
    interchangeable : tuple of (str, ...)
        Groups of labels whose order is open.
    """

    smiles: str
    tags: tuple[tuple[str, str], ...]
    assignments: tuple[RecordAssignment, ...]
    couplings: tuple[RecordCoupling, ...]
    field_mhz: float | None
    solvent: str | None
    interchangeable: tuple[tuple[str, ...], ...] = ()


def nmredata_record(ledger: Ledger) -> str:
    """Ledger as an SD record with NMReDATA tags.

    Protons are named in the form for implicit hydrogens, H3 for those on atom
    3 (atoms counted from 1). Interchangeable claims raise the level to 1.

    Parameters
    ----------
    ledger : Ledger

    Returns
    -------
    str
        Text of an .sdf file with one record.
    """
    molecule = drawable(ledger.structure)
    name = ledger.structure.name or ledger.evidence.metadata.source_name
    molecule.SetProp("_Name", name)
    tags = [
        ("NMREDATA_VERSION", f"1.1{_END}"),
        ("NMREDATA_LEVEL", f"{_level(ledger)}{_END}"),
        ("NMREDATA_ID", _identity(ledger)),
        ("NMREDATA_FORMULA", f"{CalcMolFormula(molecule)}{_END}"),
        ("NMREDATA_SMILES", f"{ledger.structure.smiles}{_END}"),
        *_conditions(ledger),
        ("NMREDATA_ASSIGNMENT", _assignment(ledger)),
        ("NMREDATA_J", _couplings(ledger)),
        ("NMREDATA_1D_1H", _signals(ledger)),
    ]
    block = Chem.MolToMolBlock(molecule)
    body = "".join(f">  <{tag}>\n{text}\n" for tag, text in tags if text)
    return f"{block}{body}$$$$\n"


def read_nmredata(path: Path) -> Record:
    """Read the first NMReDATA record of an SD file.

    Parameters
    ----------
    path : pathlib.Path

    Returns
    -------
    Record

    Raises
    ------
    RecordError
        If the file is missing, holds no structure or no NMReDATA tag.
    """
    try:
        text = path.read_text(encoding="utf-8", errors="replace")
    except FileNotFoundError as error:
        raise RecordError(path, "there is no such file") from error
    except OSError as error:
        reason = error.strerror or "it cannot be read"
        raise RecordError(path, f"it could not be read ({reason})") from error
    with rdBase.BlockLogs():
        supplier = Chem.SDMolSupplier()
        supplier.SetData(text, removeHs=False)
        molecule = next(iter(supplier), None) if len(supplier) else None
    if molecule is None:
        raise RecordError(path, "it holds no structure that can be read")
    tags = tuple(
        (name, molecule.GetProp(name))
        for name in molecule.GetPropNames()
        if name.startswith("NMREDATA_")
    )
    if not tags:
        raise RecordError(path, "it holds no NMReDATA tags")
    return _record(Chem.MolToSmiles(Chem.RemoveHs(molecule)), tags)


def _level(ledger: Ledger) -> int:
    return int(any(_is_interchangeable(entry) for entry in ledger.entries))


def _is_interchangeable(entry: Entry) -> bool:
    return entry.group is not None and entry.group.kind == "interchangeable"


def _identity(ledger: Ledger) -> str:
    source = ledger.evidence.metadata.source_name
    return (
        f"Title={source}{_END}"
        f"Comment=Spin Ledger {__version__}, SHA-256 of the raw data "
        f"{ledger.evidence.metadata.sha256}{_END}"
    )


def _conditions(ledger: Ledger) -> list[tuple[str, str]]:
    evidence = ledger.evidence
    tags = []
    if evidence.solvent:
        tags.append(("NMREDATA_SOLVENT", f"{evidence.solvent}{_END}"))
    if evidence.metadata.temperature_k is not None:
        kelvin = evidence.metadata.temperature_k
        tags.append(("NMREDATA_TEMPERATURE", f"{kelvin:.2f} K{_END}"))
    return tags


def _assignment(ledger: Ledger) -> str:
    lines = []
    for entry in ledger.entries:
        shift = UNKNOWN_SHIFT if entry.shift_ppm is None else entry.shift_ppm
        atoms = ", ".join(f"H{atom + 1}" for atom in entry.atoms)
        lines.append(f"{quoted(entry.claim)}, {plain(shift, 5)}, {atoms}{_END}")
    done: set[frozenset[str]] = set()
    for entry in ledger.entries:
        if entry.group is None or not _is_interchangeable(entry):
            continue
        names = frozenset((entry.claim, *entry.group.partners))
        if names not in done:
            done.add(names)
            listed = ", ".join(quoted(one) for one in sorted(names))
            lines.append(f"Interchangeable={listed}{_END}")
    return "".join(lines)


def _couplings(ledger: Ledger) -> str:
    lines = []
    order = {entry.claim: rank for rank, entry in enumerate(ledger.entries)}
    for entry in ledger.entries:
        for coupling in entry.couplings:
            if coupling.j_hz is None or not coupling.determined:
                continue
            if order.get(coupling.partner, -1) > order[entry.claim]:
                lines.append(
                    f"{quoted(entry.claim)}, {quoted(coupling.partner)}, "
                    f"{plain(coupling.j_hz, 3)}{_END}"
                )
    return "".join(lines)


def _signals(ledger: Ledger) -> str:
    evidence = ledger.evidence
    lines = [
        f"Larmor={evidence.metadata.spectrometer_frequency_mhz:.6f}{_END}",
        f"Spectrum_Location=file:{evidence.metadata.source_name}{_END}",
    ]
    lines += [_signal(group) for group in signal_groups(ledger)]
    return "".join(lines)


def _signal(group: Sequence[Entry]) -> str:
    """One signal; attributes in the order S, J, N, L, E, W."""
    first = group[0]
    pattern = "m" if len(group) > 1 else (first.multiplicity or "m")
    items = [_place(group), f"S={pattern.replace('br s', 'bs').replace(' ', '')}"]
    if len(group) == 1:
        known = sorted(
            (one for one in first.couplings if one.determined and one.j_hz is not None),
            key=lambda one: -abs(one.j_hz or 0.0),
        )
        if known:
            items.append(f"J={', '.join(_assigned(one) for one in known)}")
    items.append(f"N={sum(entry.protons for entry in group)}")
    labels = [quoted(entry.claim) for entry in group]
    items.append(f"L={labels[0]}" if len(labels) == 1 else f"L=({'&'.join(labels)})")
    found = [one.integral_protons for one in group if one.integral_protons is not None]
    if found:
        items.append(f"E={plain(sum(found), 4)}")
    if first.width_hz is not None:
        items.append(f"W={first.width_hz:.2f}")
    return f"{', '.join(items)}{_END}"


def _place(group: Sequence[Entry]) -> str:
    ranges = [entry.range_ppm for entry in group if entry.range_ppm is not None]
    if len(group) > 1 and ranges:
        return f"{plain(max(r[1] for r in ranges), 4)}-{plain(min(r[0] for r in ranges), 4)}"
    return plain(group[0].shift_ppm or 0.0, 4)


def _assigned(coupling: EntryCoupling) -> str:
    return f"{abs(coupling.j_hz or 0.0):.2f}({quoted(coupling.partner)})"


def quoted(label: str) -> str:
    """Label as it stands in a record: quoted where it holds a separator."""
    return f'<"{label}">' if _QUOTED.search(label) else label


def _record(smiles: str, tags: tuple[tuple[str, str], ...]) -> Record:
    found = dict(tags)
    assignments, interchangeable = _read_assignment(
        found.get("NMREDATA_ASSIGNMENT", "")
    )
    larmor = _attribute(found.get("NMREDATA_1D_1H", ""), "Larmor")
    solvent = "".join(_lines(found.get("NMREDATA_SOLVENT", ""))) or None
    return Record(
        smiles=smiles,
        tags=tags,
        assignments=assignments,
        couplings=_read_couplings(found.get("NMREDATA_J", "")),
        field_mhz=None if larmor is None else _float(larmor),
        solvent=solvent,
        interchangeable=interchangeable,
    )


def _lines(text: str) -> list[str]:
    """Lines of a tag without line ends, comments and blanks."""
    stripped = (
        line.split(";")[0].rstrip().removesuffix("\\") for line in text.splitlines()
    )
    return [line.strip() for line in stripped if line.strip()]


def _read_assignment(
    text: str,
) -> tuple[tuple[RecordAssignment, ...], tuple[tuple[str, ...], ...]]:
    found: list[RecordAssignment] = []
    groups: list[tuple[str, ...]] = []
    for line in _lines(text):
        if line.startswith("Interchangeable="):
            groups.append(tuple(_split(line.partition("=")[2])))
            continue
        parts = _split(line)
        if "=" in line or len(parts) < 2:
            continue
        shift = _float(parts[1])
        is_known = shift is not None and abs(shift - UNKNOWN_SHIFT) > 0.01
        found.append(
            RecordAssignment(
                label=parts[0],
                shift_ppm=shift if is_known else None,
                atoms=tuple(parts[2:]),
            )
        )
    return tuple(found), tuple(groups)


def _read_couplings(text: str) -> tuple[RecordCoupling, ...]:
    found = []
    for line in _lines(text):
        parts = _split(line)
        value = _float(parts[2]) if len(parts) > 2 else None
        if value is not None:
            found.append(RecordCoupling(first=parts[0], second=parts[1], j_hz=value))
    return tuple(found)


def _split(line: str) -> list[str]:
    """Fields of a line; quoted labels may hold the separator."""
    fields = re.findall(r'<"([^"]*)">|([^,]+)', line)
    return [text for quote, plain in fields if (text := quote or plain.strip())]


def _attribute(text: str, name: str) -> str | None:
    for line in _lines(text):
        key, separator, value = line.partition("=")
        if separator and key.strip() == name:
            return value.strip()
    return None


def _float(text: str) -> float | None:
    try:
        return float(text)
    except ValueError:
        return None
