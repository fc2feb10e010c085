"""Several spectra of one sample as one ledger: shared J, own shifts; ppm and Hz."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from scipy.stats import chi2 as chi2_distribution

from spinledger.sample.joint_values import (
    DISAGREE_P,
    Cell,
    Column,
    JointLedger,
    Row,
    SharedCoupling,
    Witness,
    combined,
    entry_of,
    main_index,
    same_conditions,
    shift_sd_between,
)
from spinledger.sample.joint_words import (
    come_and_go,
    coupling_sentences,
    refit_sentences,
    shift_sentences,
    turned_sentences,
    verdict_sentences,
)
from spinledger.sample.refit import Refit, refit
from spinledger.sample.shake import Shake
from spinledger.sample.tables import (
    CouplingKey,
    Figure,
    Table,
    brought_in_order,
    table_of,
)
from spinledger.values.ledger import Entry, VerdictState

Progress = Callable[[str, float], None]
Cancelled = Callable[[], bool]

# Conformers of open chains answer to solvent and temperature [common practice].
FLEXIBLE_SD_HZ = 0.4


def joint_ledger(
    witnesses: Sequence[Witness],
    *,
    shakes: Sequence[Shake] = (),
    notes: Sequence[str] = (),
    again: bool = True,
    cancelled: Cancelled | None = None,
) -> JointLedger:
    """Put the spectra of one sample side by side.

    Parameters
    ----------
    witnesses : sequence of Witness
        At least one; all reconciled with the same structure.
    shakes : sequence of Shake
    notes : sequence of str
        What else has to be said, such as a spectrum that could not be aligned.
    again : bool
        Fit spectra again with the couplings of the others where they disagree or
        leave one undetermined.
    cancelled : callable, optional

    Raises
    ------
    ValueError
        If there is no witness.
    CancelledError
        If the user stopped.

    Notes
    -----
    Each spectrum is fitted by itself. Look-alike claims (the two protons of a
    CH2) are brought into one order. Then |J| are combined by inverse variance,
    with a chi-square of their consistency; a spectrum that disagrees, or leaves
    open what another determines, is fitted once more with the others' couplings
    as priors, and what its own data say is taken out of that fit again before
    the second combination, so that nothing counts twice. Shifts stay each
    spectrum's own; in one solvent at one temperature they are compared, less
    the difference of the two references.
    """
    if not witnesses:
        raise ValueError("witnesses: need one or more")
    counting = _counting(witnesses)
    tables = _tables(witnesses, counting)
    refits: list[Refit | None] = [None] * len(witnesses)
    if again and sum(counting) > 1:
        tables, refits = _fitted_again(witnesses, tables, counting, cancelled)
    couplings = shared_couplings(witnesses, tables, counting)
    return JointLedger(
        columns=_columns(witnesses, tables, counting, refits),
        rows=_rows(witnesses, tables),
        couplings=couplings,
        shakes=tuple(shakes),
        state=joint_state(witnesses, shakes, couplings),
        probability=_probability(witnesses),
        reasons=(
            *verdict_sentences(witnesses, shakes, counting),
            *notes,
            *coupling_sentences(witnesses, couplings),
            *shift_sentences(witnesses, tables, counting),
            *(row for shake in shakes for row in shake.sentences()),
            *come_and_go(witnesses, shakes),
            *turned_sentences(witnesses, tables),
            *refit_sentences(witnesses, refits),
        ),
    )


def joint_state(
    witnesses: Sequence[Witness],
    shakes: Sequence[Shake],
    couplings: Sequence[SharedCoupling],
) -> VerdictState:
    """Verdict over all spectra.

    Reconciled if every judged one is, not reconciled if one is not, undecided
    else. A shake in which a claim went that cannot exchange, or a coupling that
    differs between fields, takes a reconciled sample back to undecided; an
    exchangeable proton that went never raises a verdict.
    """
    states = [
        one.ledger.verdict.state
        for one in witnesses
        if one.ledger.verdict.state != "not judged"
    ]
    if not states:
        return "not judged"
    if "not reconciled" in states:
        return "not reconciled"
    clear = all(one.agrees for one in couplings) and not any(
        one.contradicts for one in shakes
    )
    return "reconciled" if set(states) == {"reconciled"} and clear else "undecided"


def _probability(witnesses: Sequence[Witness]) -> float | None:
    """That of the least probable spectrum.

    Odds are not multiplied: the same predictions stand behind all spectra.
    """
    chances = [
        one.ledger.verdict.probability
        for one in witnesses
        if one.ledger.verdict.probability is not None
    ]
    return min(chances) if chances else None


def _counting(witnesses: Sequence[Witness]) -> list[bool]:
    """Which spectra show the structure well enough to share their values."""
    good = [one.ledger.verdict.state == "reconciled" for one in witnesses]
    if not any(good):
        return [one.ledger.verdict.state != "not judged" for one in witnesses]
    return [
        one.ledger.verdict.state in ("reconciled", "undecided") for one in witnesses
    ]


def _tables(witnesses: Sequence[Witness], counting: Sequence[bool]) -> list[Table]:
    main = main_index(witnesses, counting)
    first = table_of(witnesses[main].ledger)
    return [
        first
        if index == main
        else brought_in_order(
            one.ledger,
            first,
            shift_sd_ppm=shift_sd_between(witnesses[main].ledger, one.ledger),
        )
        for index, one in enumerate(witnesses)
    ]


def shared_couplings(
    witnesses: Sequence[Witness], tables: Sequence[Table], counting: Sequence[bool]
) -> tuple[SharedCoupling, ...]:
    """Couplings by inverse variance, with the chi-square of their consistency."""
    keys = dict.fromkeys(key for table in tables for key in table.couplings_hz)
    rigid = _rigid_keys(witnesses)
    varied = any(
        not same_conditions(witnesses[0].ledger, one.ledger) for one in witnesses
    )
    rows = []
    for key in keys:
        extra = FLEXIBLE_SD_HZ if varied and key[:2] not in rigid else 0.0
        values = tuple(
            table.couplings_hz.get(key) if counts else None
            for table, counts in zip(tables, counting, strict=True)
        )
        found = [one for one in values if one is not None]
        if not found:
            continue
        mean, sd, chi2 = combined(found, extra_sd=extra)
        degrees = len(found) - 1
        agrees = not degrees or float(chi2_distribution.sf(chi2, degrees)) > DISAGREE_P
        rows.append(
            SharedCoupling(
                claim=key[0],
                partner=key[1],
                number=key[2],
                j_hz=mean,
                sd_hz=sd,
                values=values,
                chi2=chi2,
                n_values=len(found),
                agrees=agrees,
            )
        )
    return tuple(rows)


def _rigid_keys(witnesses: Sequence[Witness]) -> set[tuple[str, str]]:
    rigid = set()
    for one in witnesses:
        claims = one.ledger.claims
        for coupling in claims.couplings:
            owners = [claims.particles[k].claim for k in coupling.pairs[0]]
            labels = sorted(claims.claims[k].label for k in owners if k is not None)
            if coupling.is_rigid and len(labels) == 2:
                rigid.add((labels[0], labels[1]))
    return rigid


def _fitted_again(
    witnesses: Sequence[Witness],
    tables: list[Table],
    counting: Sequence[bool],
    cancelled: Cancelled | None,
) -> tuple[list[Table], list[Refit | None]]:
    """Spectra that disagree or leave couplings open, fitted with the others' J."""
    refits: list[Refit | None] = []
    fresh = []
    for index, one in enumerate(witnesses):
        others = [counts and place != index for place, counts in enumerate(counting)]
        outside = shared_couplings(witnesses, tables, others)
        known = {
            (row.claim, row.partner, row.number): Figure(value=row.j_hz, sd=row.sd_hz)
            for row in outside
            if row.agrees
        }
        if not counting[index] or not _has_to_learn(tables[index], known):
            refits.append(None)
            fresh.append(tables[index])
            continue
        done = refit(one.ledger, tables[index], known, cancelled=cancelled)
        refits.append(done)
        fresh.append(tables[index] if done is None or not done.taken else done.table)
    return fresh, refits


def _has_to_learn(table: Table, known: dict[CouplingKey, Figure]) -> bool:
    for key, theirs in known.items():
        mine = table.couplings_hz.get(key)
        if mine is None:
            return True
        if abs(mine.value - theirs.value) > 3.0 * np.hypot(mine.sd, theirs.sd):
            return True
    return False


def _columns(
    witnesses: Sequence[Witness],
    tables: Sequence[Table],
    counting: Sequence[bool],
    refits: Sequence[Refit | None],
) -> tuple[Column, ...]:
    return tuple(
        Column(
            name=one.name,
            role=one.role,
            solvent=one.ledger.evidence.solvent,
            field_mhz=one.ledger.evidence.spectrum.spectrometer_frequency_mhz,
            temperature_k=one.ledger.evidence.metadata.temperature_k,
            state=one.ledger.verdict.state,
            probability=one.ledger.verdict.probability,
            counts=counts,
            turned=table.turned,
            refit=again,
        )
        for one, table, counts, again in zip(
            witnesses, tables, counting, refits, strict=True
        )
    )


def _rows(witnesses: Sequence[Witness], tables: Sequence[Table]) -> tuple[Row, ...]:
    labels = dict.fromkeys(
        entry.claim for one in witnesses for entry in one.ledger.entries
    )
    rows = []
    for label in labels:
        found = [entry_of(one.ledger, label) for one in witnesses]
        cells = [
            None if entry is None else _cell(entry, table.shifts_ppm.get(label))
            for entry, table in zip(found, tables, strict=True)
        ]
        protons = next(entry.protons for entry in found if entry is not None)
        rows.append(Row(claim=label, protons=protons, cells=tuple(cells)))
    return tuple(rows)


def _cell(entry: Entry, figure: Figure | None) -> Cell:
    return Cell(
        shift_ppm=None if figure is None else figure.value,
        shift_sd_ppm=None if figure is None else figure.sd,
        state=entry.state,
    )
