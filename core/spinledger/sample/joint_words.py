"""What the spectra of a sample say together, in sentences."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.stats import chi2 as chi2_distribution

from spinledger.sample.joint_values import (
    DISAGREE_P,
    SharedCoupling,
    Witness,
    combined,
    entry_of,
    main_index,
    same_conditions,
    shift_sd_between,
)
from spinledger.sample.refit import Refit
from spinledger.sample.roles import same_field
from spinledger.sample.shake import Shake
from spinledger.sample.tables import Figure, Table, zero_offset

SHIFT_DISAGREES_SD = 3.0


def verdict_sentences(
    witnesses: Sequence[Witness], shakes: Sequence[Shake], counting: Sequence[bool]
) -> list[str]:
    """Verdict of each spectrum, and what stands out of line."""
    order = sorted(witnesses, key=lambda one: one.ledger.verdict.probability or 0.0)
    rows = [f"{one.name}: {one.ledger.verdict.state}." for one in order]
    good = [one.name for one in witnesses if one.ledger.verdict.state == "reconciled"]
    for one, counts in zip(witnesses, counting, strict=True):
        if not counts and good:
            rows.append(
                f"{one.name} does not show the structure that {', '.join(good)} does; "
                "it may be another compound, and its values are left out of the "
                "shared ones."
            )
    if any(one.contradicts for one in shakes):
        rows.append("A claim that cannot exchange went in the shake.")
    return rows


def coupling_sentences(
    witnesses: Sequence[Witness], couplings: Sequence[SharedCoupling]
) -> list[str]:
    """Couplings that differ between the spectra, with the likely reason."""
    rows = []
    for one in couplings:
        if one.agrees:
            continue
        known = [
            (witness, value)
            for witness, value in zip(witnesses, one.values, strict=True)
            if value is not None
        ]
        figures = ", ".join(
            f"{value.value:.2f} ± {value.sd:.2f} Hz in {witness.name}"
            for witness, value in known
        )
        start = f"J({one.claim}, {one.partner}) differs: {figures}"
        rows.append(f"{start}; {_why_it_differs(known)}.")
    return rows


def _why_it_differs(known: Sequence[tuple[Witness, Figure]]) -> str:
    fields = [
        witness.ledger.evidence.spectrum.spectrometer_frequency_mhz
        for witness, _ in known
    ]
    in_ppm = [
        Figure(value=value.value / field, sd=value.sd / field)
        for (_, value), field in zip(known, fields, strict=True)
    ]
    if not same_field(min(fields), max(fields)):
        _, _, chi2 = combined(in_ppm)
        if float(chi2_distribution.sf(chi2, len(in_ppm) - 1)) > DISAGREE_P:
            return (
                "it grows with the field, so it is a difference of shifts and not a "
                "coupling"
            )
    if not all(same_conditions(known[0][0].ledger, one.ledger) for one, _ in known):
        return "solvent or temperature may have moved the conformers"
    return "a coupling must be the same in Hz in every spectrum"


def shift_sentences(
    witnesses: Sequence[Witness], tables: Sequence[Table], counting: Sequence[bool]
) -> list[str]:
    """Shifts that should be the same in ppm and are not."""
    rows = []
    main = main_index(witnesses, counting)
    for index, one in enumerate(witnesses):
        ledger = witnesses[main].ledger
        sd = shift_sd_between(ledger, one.ledger)
        if index == main or sd is None or not counting[index]:
            continue
        offset = zero_offset(tables[main], tables[index])
        loose = {c.label for c in one.ledger.claims.claims if c.is_exchangeable}
        for label, mine in tables[main].shifts_ppm.items():
            theirs = tables[index].shifts_ppm.get(label)
            if theirs is None or label in loose:
                continue
            apart = mine.value - theirs.value - offset
            if abs(apart) > SHIFT_DISAGREES_SD * np.hypot(sd, theirs.sd):
                rows.append(
                    f"{label} stands at {mine.value:.3f} ppm in "
                    f"{witnesses[main].name} and at {theirs.value + offset:.3f} in "
                    f"{one.name} (references made equal), further apart than "
                    f"{SHIFT_DISAGREES_SD:g} times the {sd:g} ppm that one solvent "
                    "allows."
                )
    return rows


def come_and_go(witnesses: Sequence[Witness], shakes: Sequence[Shake]) -> list[str]:
    """Exchangeable claims that are seen in one spectrum and not in another."""
    told = {
        name
        for shake in shakes
        for one in shake.fractions
        if one.fraction is not None
        for name in one.claims
    }
    labels = dict.fromkeys(
        claim.label
        for one in witnesses
        for claim in one.ledger.claims.claims
        if claim.is_exchangeable
    )
    rows = []
    for label in labels:
        if label in told:
            continue
        seen: list[str] = []
        gone: list[str] = []
        for one in witnesses:
            entry = entry_of(one.ledger, label)
            is_seen = entry is not None and entry.shift_ppm is not None
            (seen if is_seen else gone).append(_in_solvent(one))
        if seen and gone:
            rows.append(
                f"{label} is seen in {', '.join(seen)} and not in {', '.join(gone)}, "
                "as an exchangeable proton may."
            )
    return rows


def _in_solvent(one: Witness) -> str:
    solvent = one.ledger.evidence.solvent
    return f"{one.name} in {solvent}" if solvent else one.name


def turned_sentences(
    witnesses: Sequence[Witness], tables: Sequence[Table]
) -> list[str]:
    """Claims that were taken the other way round."""
    return [
        f"{pair[0]} and {pair[1]} are taken the other way round in {one.name}, so that "
        "its couplings and shifts agree with the others."
        for one, table in zip(witnesses, tables, strict=True)
        for pair in table.turned
    ]


def refit_sentences(
    witnesses: Sequence[Witness], refits: Sequence[Refit | None]
) -> list[str]:
    """How a spectrum took the couplings of the others."""
    rows = []
    for one, again in zip(witnesses, refits, strict=True):
        if again is None:
            continue
        shares = (
            f"{100 * again.share_before:.1f} % unexplained with its own, "
            f"{100 * again.share_after:.1f} % with theirs"
        )
        words = (
            "is explained as well with the couplings of the others"
            if again.taken
            else "is not explained with the couplings of the others, and keeps its own"
        )
        rows.append(f"{one.name} {words} ({shares}).")
    return rows
