"""Everything that the spectra of one sample say together, by their roles."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

from spinledger.errors import EvidenceError
from spinledger.sample.batch_reference import (
    BatchComparison,
    BatchLimits,
    best_reference,
    compare_batch,
)
from spinledger.sample.joint import joint_ledger
from spinledger.sample.joint_values import JointLedger, Witness
from spinledger.sample.shake import Shake, shake_pair
from spinledger.values.evidence import Evidence

Cancelled = Callable[[], bool]


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class SampleOutcome:
    """Joint ledger, with the batch comparisons beside it."""

    joint: JointLedger
    comparisons: tuple[BatchComparison, ...]


def put_together(
    witnesses: Sequence[Witness],
    *,
    limits: BatchLimits | None = None,
    notes: Sequence[str] = (),
    again: bool = True,
    cancelled: Cancelled | None = None,
) -> SampleOutcome:
    """Joint ledger, shake pairs and batch comparisons of one sample.

    Parameters
    ----------
    witnesses : sequence of Witness
        Reconciled one by one; those in the roles of shake and reference are set
        against the main one (the first, where none is).
    limits : BatchLimits, optional
    notes : sequence of str
        What has to be said besides.
    again : bool
        Fit again with the couplings of the others where that may help.
    cancelled : callable, optional

    Raises
    ------
    ValueError
        If there is no witness.
    CancelledError
        If the user stopped.
    """
    if not witnesses:
        raise ValueError("witnesses: need one or more")
    main = next((one for one in witnesses if one.role == "main"), witnesses[0])
    said = list(notes)
    shakes: list[Shake] = []
    comparisons: list[BatchComparison] = []
    for one in witnesses:
        if one is main:
            continue
        try:
            if one.role == "D2O shake":
                shakes.append(_shaken(main, one))
            elif one.role == "reference":
                comparisons.append(_compared(main, one, limits))
        except EvidenceError as error:
            said.append(f"{one.name} is not set against {main.name}: {error.reason}.")
    joint = joint_ledger(
        witnesses, shakes=shakes, notes=said, again=again, cancelled=cancelled
    )
    return SampleOutcome(joint=joint, comparisons=tuple(comparisons))


def name_compound(main: Witness, references: Sequence[Witness]) -> str | None:
    """Sentence that names the reference a spectrum shows, where it shows one.

    Parameters
    ----------
    main : Witness
    references : sequence of Witness
    """
    found = best_reference(
        main.ledger.evidence, [one.ledger.evidence for one in references]
    )
    if found is None:
        return None
    evidence, share = found
    name = next(one.name for one in references if one.ledger.evidence is evidence)
    return (
        f"{main.name} shows {100 * share:.0f} % of the signals of {name}: it holds the "
        "same compound."
    )


def _shaken(main: Witness, one: Witness) -> Shake:
    ledger = replace(main.ledger, evidence=_named(main))
    return shake_pair(ledger, _named(one))


def _named(one: Witness) -> Evidence:
    """Evidence under the name that the sample gives it."""
    evidence = one.ledger.evidence
    return replace(evidence, metadata=replace(evidence.metadata, source_name=one.name))


def _compared(
    main: Witness, one: Witness, limits: BatchLimits | None
) -> BatchComparison:
    claims = main.ledger.claims.claims
    protons = sum(
        claim.n_protons
        for claim in claims
        if claim.visibility == "seen" and not claim.is_exchangeable
    )
    return compare_batch(
        _named(main),
        _named(one),
        n_protons=max(float(protons), 1.0),
        limits=limits,
    )
