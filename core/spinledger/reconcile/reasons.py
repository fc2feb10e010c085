"""Why a verdict came out as it did, most important first, in plain sentences."""

from __future__ import annotations

from spinledger.processing.solvents import is_aqueous
from spinledger.reconcile.envelopes import is_balanced
from spinledger.reconcile.evaluate import Evaluation
from spinledger.values.evidence import Stray
from spinledger.values.ledger import Entry

POOR_RESIDUAL = 0.2
NOTABLE_STRAY_PROTONS = 0.15


def verdict_reasons(evaluation: Evaluation) -> tuple[str, ...]:
    """Reasons of one structure's verdict.

    Open claims come first, then disputed entries by their largest residual,
    then area without an owner, then the overall misfit. Where nothing speaks
    against the structure, it is said what speaks for it.
    """
    if evaluation.booking is None or evaluation.assessment is None:
        return (_why_not_judged(evaluation),)
    entries = evaluation.booking.entries
    against = [reason for entry in _open(entries) for reason in entry.reasons]
    against += [reason for entry in _disputed(entries) for reason in entry.reasons]
    against += [one.sentence for one in evaluation.side if one.cost > 0]
    against += _stray_sentences(evaluation.strays)
    share = evaluation.assessment.residual_share
    if share > POOR_RESIDUAL:
        against.append(
            f"the best fit leaves {100 * share:.0f} % of the signal area unexplained "
            "or without support"
        )
    for_it = [_settled_sentence(evaluation), *_order_sentences(entries)]
    said = [*against, *for_it] if against else for_it
    said += [one.sentence for one in evaluation.side if one.cost == 0]
    said += _circumstances(evaluation)
    return tuple(sentence for sentence in said if sentence)


def _why_not_judged(evaluation: Evaluation) -> str:
    if not any(claim.visibility != "silent" for claim in evaluation.claims.claims):
        return "the structure claims no proton that this spectrum could show"
    return "the spectrum shows no signal that could be compared"


def _open(entries: tuple[Entry, ...]) -> list[Entry]:
    rows = [entry for entry in entries if entry.state == "open"]
    return sorted(rows, key=lambda entry: -entry.protons)


def _disputed(entries: tuple[Entry, ...]) -> list[Entry]:
    rows = [entry for entry in entries if entry.state == "disputed"]
    return sorted(rows, key=lambda entry: -_severity(entry))


def _severity(entry: Entry) -> float:
    residuals = (entry.shift_residual_sd, entry.j_residual_sd)
    return max((abs(value) for value in residuals if value is not None), default=0.0)


def _stray_sentences(strays: tuple[Stray, ...]) -> list[str]:
    rows = [
        stray
        for stray in strays
        if stray.kind == "unexplained"
        and (stray.protons is None or stray.protons > NOTABLE_STRAY_PROTONS)
    ]
    rows.sort(key=lambda stray: -(stray.protons or 0.0))
    return [
        f"the signal at {stray.low_ppm:z.2f} to {stray.high_ppm:z.2f} ppm has no owner"
        + (f" ({stray.protons:.1f} H by area)" if stray.protons is not None else "")
        for stray in rows[:4]
    ]


def _settled_sentence(evaluation: Evaluation) -> str:
    """How many protons agree; exchangeable ones are not counted."""
    if evaluation.booking is None:
        return ""
    steady = {one.label for one in evaluation.claims.claims if is_balanced(one)}
    rows = [e for e in evaluation.booking.entries if e.claim in steady]
    of = sum(entry.protons for entry in rows if entry.state != "silent")
    protons = sum(entry.protons for entry in rows if entry.state == "settled")
    if not protons:
        return ""
    if protons == of:
        return f"all {of} H that must be seen stand where the structure puts them"
    return f"{protons} of {of} H that must be seen agree"


def _order_sentences(entries: tuple[Entry, ...]) -> list[str]:
    said, done = [], set()
    for entry in entries:
        group = entry.group
        if group is None or group.kind != "interchangeable" or entry.claim in done:
            continue
        done |= {entry.claim, *group.partners}
        said.append(
            f"{entry.claim} and {', '.join(group.partners)} may stand the other way "
            "round"
        )
    return said


def _circumstances(evaluation: Evaluation) -> list[str]:
    """Conflicts and limits that the reader should know."""
    evidence = evaluation.evidence
    said = []
    if _conflict(evidence.solvent, evidence.solvent_seen):
        said.append(
            f"{evidence.solvent} was taken as the solvent, but the spectrum shows "
            f"{evidence.solvent_seen}"
        )
    elif _conflict(evidence.solvent, evidence.solvent_header):
        said.append(
            f"the header names {evidence.solvent_header}, but {evidence.solvent} "
            "was taken as the solvent"
        )
    if evaluation.solution is not None and not evaluation.solution.is_complete:
        said.append("the time allowed ran out: this is the best of what was tried")
    return said


def _conflict(used: str | None, other: str | None) -> bool:
    """Whether two solvents differ by more than the share of heavy water."""
    if used is None or other is None or used == other:
        return False
    return not (is_aqueous(used) and is_aqueous(other))
