"""Ratios, conversion, dr and E/Z of a mixture from one reconciled spectrum; mol %."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
import numpy.typing as npt
from rdkit import Chem

from spinledger.errors import StructureError
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.run import reconcile
from spinledger.sample.traces import integral, trace_of
from spinledger.structure.read import molecule
from spinledger.values.evidence import Evidence
from spinledger.values.ledger import Entry, Ledger
from spinledger.values.structure import Structure

Part = Literal["starting material", "product", "by-product"]
Progress = Callable[[str, float], None]
Cancelled = Callable[[], bool]

# Relaxation and pulse angle leave integrals this unsure, a share of an overlap
# twice as much [common practice].
INTEGRAL_SD_SHARE = 0.03
FITTED_SD_SHARE = 0.06
# Width of the empty stretch that tells what could still be seen.
SEEN_WIDTH_HZ = 12.0
_NUMBERED = re.compile(r" \((\d+)\)$")


@dataclass(frozen=True, slots=True, kw_only=True)
class Component:
    """One compound of a mixture, as the chemist knows it."""

    name: str
    structure: Structure
    part: Part = "product"


@dataclass(frozen=True, slots=True, kw_only=True)
class Amount:
    """How much of a component is there, in common protons.

    Attributes
    ----------
    name : str
    part : str
    amount, sd : float
        Relative to the scale of the ledger.
    mol_percent, mol_percent_sd : float
        Of all components.
    by_integral : bool
        From signals that no other component touches; else from the fit.
    claims : tuple of str
        Whose areas were used; empty where nothing of it was found, and then
        ``sd`` is what could hide in the noise.
    """

    name: str
    part: Part
    amount: float
    sd: float
    mol_percent: float
    mol_percent_sd: float
    by_integral: bool
    claims: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class RatioFigure:
    """A share between two groups of components: conversion, dr or E/Z.

    ``percent`` is the share of ``first`` in both together.
    """

    kind: Literal["conversion", "dr", "E/Z"]
    first: str
    second: str
    percent: float
    sd: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Mixture:
    """Composition of a mixture.

    Attributes
    ----------
    ledger : Ledger
        Of all components together.
    amounts : tuple of Amount
    ratios : tuple of RatioFigure
    notes : tuple of str
    """

    ledger: Ledger
    amounts: tuple[Amount, ...]
    ratios: tuple[RatioFigure, ...]
    notes: tuple[str, ...]

    def sentences(self) -> tuple[str, ...]:
        """Every amount and ratio, and how it was got."""
        return (
            *(_amount_sentence(one) for one in self.amounts),
            *(_ratio_sentence(one) for one in self.ratios),
            *self.notes,
        )


def measure_mixture(
    evidence: Evidence,
    components: Sequence[Component],
    *,
    options: ReconcileOptions | None = None,
    progress: Progress | None = None,
    cancelled: Cancelled | None = None,
) -> Mixture:
    """Fit all components together and say how much of each is there.

    Parameters
    ----------
    evidence : Evidence
    components : sequence of Component
        Two or more, all different.
    options : ReconcileOptions, optional
    progress : callable, optional
    cancelled : callable, optional

    Raises
    ------
    StructureError
        If two components are the same, or mirror images of each other.
    ValueError
        If there are fewer than two.
    CancelledError
        If the user stopped.
    """
    check_components(components)
    chosen = replace(
        options or ReconcileOptions(),
        species=tuple(one.structure for one in components[1:]),
        n_contenders=0,
    )
    ledger = reconcile(
        evidence,
        components[0].structure,
        options=chosen,
        progress=progress,
        cancelled=cancelled,
    )
    return mixture_of(ledger, components)


def mixture_of(ledger: Ledger, components: Sequence[Component]) -> Mixture:
    """Composition from a ledger of all components.

    Parameters
    ----------
    ledger : Ledger
        Reconciled with the first component as the structure and the others as
        further species, in this order.
    components : sequence of Component

    Notes
    -----
    Every steady claim gives area over protons. Claims whose signal no other
    component shares are taken by integral; only where a component has none of
    them do its fitted shares of overlaps stand in, and that is said. Weighted
    mean, sd widened by the scatter.
    """
    limit = _hidden_amount(ledger)
    found = [_amount(ledger, k, one, limit) for k, one in enumerate(components)]
    amounts = _in_mol_percent(found)
    notes = _doubt(ledger)
    notes += [
        f"{one.name} has no signal of its own; its amount is from the line-shape fit."
        for one in amounts
        if one.claims and not one.by_integral
    ]
    ratios = _ratios(components, amounts)
    notes += [
        f"Which of {one.first} and {one.second} is the larger part rests on predicted "
        "shifts and couplings."
        for one in ratios
        if one.kind == "dr"
    ]
    return Mixture(ledger=ledger, amounts=amounts, ratios=ratios, notes=tuple(notes))


def _doubt(ledger: Ledger) -> list[str]:
    """Amounts stand on the assignment; where that is not sure, they are not."""
    if ledger.verdict.state == "reconciled":
        return []
    return [
        f"The components together are {ledger.verdict.state}: the amounts hold only as "
        "far as the assignment does, and their uncertainty does not hold that doubt."
    ]


def check_components(components: Sequence[Component]) -> None:
    """Refuse fewer than two, twins, and mirror images.

    Raises
    ------
    ValueError
        If there are fewer than two.
    StructureError
        If two cannot be told apart by a proton spectrum.
    """
    if len(components) < 2:
        raise ValueError(f"components: need two or more, got {len(components)}")
    for index, one in enumerate(components):
        for other in components[index + 1 :]:
            first, second = molecule(one.structure), molecule(other.structure)
            if Chem.MolToSmiles(first) == Chem.MolToSmiles(second):
                raise StructureError(
                    other.name, f"it is the same compound as {one.name}"
                )
            if Chem.MolToSmiles(_mirrored(first)) == Chem.MolToSmiles(second):
                raise StructureError(
                    other.name,
                    f"it is the mirror image of {one.name}; a proton spectrum in an "
                    "achiral solvent does not tell them apart",
                )


def stereo_kind(one: Structure, other: Structure) -> Literal["dr", "E/Z"] | None:
    """How two structures of one connectivity differ; None where they differ in it."""
    first, second = molecule(one), molecule(other)
    flat = [Chem.MolToSmiles(mol, isomericSmiles=False) for mol in (first, second)]
    if flat[0] != flat[1]:
        return None
    bonds = [Chem.MolToSmiles(_without_centres(mol)) for mol in (first, second)]
    return "dr" if bonds[0] == bonds[1] else "E/Z"


def _mirrored(mol: Chem.Mol) -> Chem.Mol:
    copy = Chem.Mol(mol)
    for atom in copy.GetAtoms():
        atom.InvertChirality()
    return copy


def _without_centres(mol: Chem.Mol) -> Chem.Mol:
    copy = Chem.Mol(mol)
    for atom in copy.GetAtoms():
        atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    return copy


def _component_of(label: str) -> int:
    """Number of the component in the label of a claim of several species."""
    found = _NUMBERED.search(label)
    return 0 if found is None else int(found.group(1)) - 1


def _amount(ledger: Ledger, index: int, component: Component, limit: float) -> Amount:
    loose = {one.label for one in ledger.claims.claims if one.is_exchangeable}
    rows = [
        one
        for one in ledger.entries
        if _component_of(one.claim) == index
        and one.claim not in loose
        and one.integral_protons is not None
    ]
    # What is disputed carries a stray or stands in a wrong place.
    rows = [one for one in rows if one.state == "settled"] or rows
    others = [one for one in ledger.entries if _component_of(one.claim) != index]
    alone = [one for one in rows if not _touches(one, others)]
    chosen = alone or rows
    share = INTEGRAL_SD_SHARE if alone else FITTED_SD_SHARE
    amount, sd = _mean(chosen, share) if chosen else (0.0, limit)
    return Amount(
        name=component.name,
        part=component.part,
        amount=amount,
        sd=sd,
        mol_percent=0.0,
        mol_percent_sd=0.0,
        by_integral=bool(alone),
        claims=tuple(one.claim for one in chosen),
    )


def _touches(entry: Entry, others: Sequence[Entry]) -> bool:
    """Whether its signal is shared with, or overlaps, another component's."""
    names = {one.claim for one in others}
    if entry.group is not None and names & set(entry.group.partners):
        return True
    if entry.range_ppm is None:
        return False
    low, high = entry.range_ppm
    return any(
        one.range_ppm is not None and low < one.range_ppm[1] and one.range_ppm[0] < high
        for one in others
    )


def _mean(entries: Sequence[Entry], share: float) -> tuple[float, float]:
    values, sds = [], []
    for one in entries:
        area = one.integral_protons or 0.0
        values.append(area / one.protons)
        noise = (one.integral_sd_protons or 0.0) / one.protons
        sds.append(float(np.hypot(noise, share * values[-1])))
    numbers, weights = np.array(values), 1.0 / np.square(np.maximum(sds, 1e-9))
    # A middle value first, so that one claim with a stray upon it does not lead.
    middle = float(np.median(numbers))
    spread = max(1.4826 * float(np.median(np.abs(numbers - middle))), 1e-9)
    kept = np.abs(numbers - middle) <= 4.0 * np.maximum(spread, np.array(sds))
    numbers, weights = numbers[kept], weights[kept]
    mean = float(np.sum(weights * numbers) / np.sum(weights))
    chi2 = float(np.sum(weights * (numbers - mean) ** 2))
    widened = max(1.0, chi2 / max(numbers.size - 1, 1)) ** 0.5
    return mean, float(np.sum(weights) ** -0.5 * widened)


def _hidden_amount(ledger: Ledger) -> float:
    """Protons that the noise could hide, one sd."""
    if ledger.model is None or ledger.model.area_per_proton <= 0.0:
        return 0.0
    trace = trace_of(ledger.evidence)
    half_ppm = SEEN_WIDTH_HZ / 2.0 / trace.frequency_mhz
    middle = float(np.median(trace.shifts_ppm))
    sd = integral(trace, middle - half_ppm, middle + half_ppm).sd
    return sd / ledger.model.area_per_proton


def _in_mol_percent(amounts: Sequence[Amount]) -> tuple[Amount, ...]:
    values = np.array([one.amount for one in amounts])
    variances = np.array([one.sd**2 for one in amounts])
    total = float(values.sum())
    if total <= 0.0:
        return tuple(amounts)
    rows = []
    for index, one in enumerate(amounts):
        share = values[index] / total
        slopes: npt.NDArray[np.float64] = np.full(values.size, -share / total)
        slopes[index] += 1.0 / total
        sd = float(np.sqrt(np.sum(slopes**2 * variances)))
        rows.append(
            replace(one, mol_percent=100.0 * float(share), mol_percent_sd=100.0 * sd)
        )
    return tuple(rows)


def _ratios(
    components: Sequence[Component], amounts: Sequence[Amount]
) -> tuple[RatioFigure, ...]:
    rows: list[RatioFigure] = []
    for index, one in enumerate(components):
        for k in range(index + 1, len(components)):
            kind = stereo_kind(one.structure, components[k].structure)
            if kind is not None:
                pair = ([amounts[index]], [amounts[k]])
                rows.append(_ratio(kind, pair, (one.name, components[k].name)))
    start = [one for one in amounts if one.part == "starting material"]
    rest = [one for one in amounts if one.part != "starting material"]
    if start and rest:
        names = (
            " and ".join(one.name for one in rest),
            " and ".join(one.name for one in start),
        )
        rows.append(_ratio("conversion", (rest, start), names))
    return tuple(rows)


def _ratio(
    kind: Literal["conversion", "dr", "E/Z"],
    groups: tuple[Sequence[Amount], Sequence[Amount]],
    names: tuple[str, str],
) -> RatioFigure:
    first, second = (sum(one.amount for one in group) for group in groups)
    sds = [sum(one.sd**2 for one in group) ** 0.5 for group in groups]
    total = first + second
    if total <= 0.0:
        return RatioFigure(
            kind=kind, first=names[0], second=names[1], percent=0.0, sd=100.0
        )
    sd = float(np.hypot(second * sds[0], first * sds[1])) / total**2
    return RatioFigure(
        kind=kind,
        first=names[0],
        second=names[1],
        percent=100.0 * first / total,
        sd=100.0 * sd,
    )


def _amount_sentence(one: Amount) -> str:
    if not one.claims:
        limit = f"{3.0 * one.mol_percent_sd:.1g}"
        return f"{one.name} was not found (less than {limit} mol % by the noise)."
    how = "by integral" if one.by_integral else "from the line-shape fit"
    return (
        f"{one.name}: {one.mol_percent:.1f} ± {one.mol_percent_sd:.1f} mol % "
        f"({how}, {len(one.claims)} claims)."
    )


def _ratio_sentence(one: RatioFigure) -> str:
    if one.kind == "conversion":
        return f"Conversion to {one.first}: {one.percent:.1f} ± {one.sd:.1f} %."
    return (
        f"{one.kind} of {one.first} to {one.second}: {one.percent:.1f} : "
        f"{100.0 - one.percent:.1f} (± {one.sd:.1f})."
    )
