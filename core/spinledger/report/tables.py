"""Rows of the report's tables as plain text, shared by all formats.

Shifts in ppm, couplings in Hz, integrals in protons.
"""

from __future__ import annotations

from dataclasses import dataclass

from spinledger.project.document import Sample
from spinledger.report.compare import ListComparison
from spinledger.report.published import ListedSignal
from spinledger.report.words import (
    fixed,
    label_glyphs,
    outgoing,
    outgoing_state,
    outgoing_verdict,
    plus_minus,
    protons,
    shift_range,
    signed,
    whole,
    with_sd,
)
from spinledger.values.evidence import Stray
from spinledger.values.ledger import Contender, Entry, EntryCoupling, Ledger
from spinledger.values.recipe import (
    Apodize,
    Baseline,
    FourierTransform,
    Phase,
    Reference,
    RemoveDelay,
    ZeroFill,
)

ASSIGNMENT_HEAD = (
    "Claim",
    "δ, ppm",
    "Found",
    "Pattern",
    "J, Hz (partner)",
    "Predicted δ",
    "Largest residual",
    "State",
)
STRAY_HEAD = ("Range, ppm", "Kind", "Size", "Why")
CONTENDER_HEAD = ("Structure", "Origin", "Result", "Why")
COMPARISON_HEAD = (
    "Claims",
    "Here, ppm",
    "Published, ppm",
    "Difference",
    "J, Hz",
    "Remarks",
)
# Who made it, who went through it as a second person, who lets it go.
ROLES = ("Made by", "Reviewed by", "Released by")
SIGNATURE_HEAD = ("Role", "Name", "Date", "Remark")
_SHIFT_DIGITS = 4
_J_DIGITS = 2


@dataclass(frozen=True, slots=True, kw_only=True)
class AssignmentRow:
    """One entry as printed; ``notes`` are small lines under the row."""

    cells: tuple[str, ...]
    state: str
    notes: tuple[str, ...]


def assignment_rows(ledger: Ledger) -> tuple[AssignmentRow, ...]:
    """Rows of the assignment table: observed ones by falling shift, then the rest."""
    order = {"settled": 0, "disputed": 0, "open": 1, "silent": 2}
    entries = sorted(
        ledger.entries, key=lambda one: (order[one.state], -(one.shift_ppm or 0.0))
    )
    return tuple(_assignment_row(ledger, entry) for entry in entries)


def balance_cells(ledger: Ledger) -> tuple[str, ...]:
    """Closing row: found and claimed protons under their columns."""
    balance = ledger.balance
    scale = (
        f"scale set by {label_glyphs(balance.scale_signal)}"
        if balance.scale_signal
        else ""
    )
    return (
        "Balance",
        "",
        protons(balance.found),
        "",
        scale,
        f"{whole(balance.claimed)}\u00a0H claimed",
        "",
        "",
    )


def stray_rows(ledger: Ledger) -> tuple[tuple[str, ...], ...]:
    """Rows of what no claim owns, unexplained ones first."""
    order = sorted(
        ledger.strays, key=lambda one: (one.kind != "unexplained", -one.high_ppm)
    )
    return tuple(_stray_row(stray) for stray in order)


def contender_rows(
    ledger: Ledger, listed: tuple[str, ...] = ()
) -> tuple[tuple[str, ...], ...]:
    """Rows of the tested structures, those still standing first.

    Parameters
    ----------
    ledger : Ledger
    listed : tuple of str
        SMILES to list; none, or none that was tested, lists all.
    """
    order = sorted(_listed(ledger, listed), key=lambda one: one.excluded)
    return tuple(_contender_row(one) for one in order)


def contender_note(ledger: Ledger, listed: tuple[str, ...]) -> str:
    """One sentence on the tested structures that are not listed; empty for none."""
    shown = _listed(ledger, listed)
    left_out = [one for one in ledger.contenders if one not in shown]
    if not left_out:
        return ""
    n_excluded = sum(one.excluded for one in left_out)
    return (
        f"Tested and not listed: {len(left_out)}, of which {n_excluded} excluded "
        f"and {len(left_out) - n_excluded} not excluded."
    )


def _listed(ledger: Ledger, listed: tuple[str, ...]) -> tuple[Contender, ...]:
    chosen = tuple(one for one in ledger.contenders if one.smiles in listed)
    return chosen or ledger.contenders


def comparison_rows(comparison: ListComparison) -> tuple[tuple[str, ...], ...]:
    """Rows of a published list beside the ledger; one-sided signals last."""
    rows = [
        (
            label_glyphs(pair.mine.label),
            _listed_shift(pair.mine, 3),
            _listed_shift(pair.published, 2),
            signed(pair.difference_ppm, 3),
            ", ".join(f"{fixed(a, 1)} / {fixed(b, 1)}" for a, b in pair.couplings_hz),
            "; ".join(pair.remarks),
        )
        for pair in comparison.pairs
    ]
    rows += [
        (label_glyphs(one.label), _listed_shift(one, 3), "", "", "", "only here")
        for one in comparison.only_mine
    ]
    rows += [
        (one.label, "", _listed_shift(one, 2), "", "", "only published")
        for one in comparison.only_published
    ]
    return tuple(rows)


def comparison_sentence(comparison: ListComparison) -> str:
    """What was taken out of the differences to a published list."""
    offset = signed(comparison.offset_ppm, 3)
    return (
        f"One common offset of {offset}\u00a0ppm (here minus published) is taken out "
        "of every difference."
    )


def sample_rows(sample: Sample) -> tuple[tuple[str, str], ...]:
    """What the label of the tube says; fields left empty are left out."""
    rows = (
        ("Sample", sample.name),
        ("Batch", sample.batch),
        ("Project", sample.project),
        ("Submitted by", sample.submitted_by),
        ("Operator", sample.operator),
        ("Laboratory", sample.laboratory),
        ("Prepared", sample.prepared),
        ("Remark", sample.remark),
    )
    return tuple((name, value) for name, value in rows if value)


def signature_rows(sample: Sample) -> tuple[tuple[str, str, str, str], ...]:
    """Signed lines, then blank ones for the maker and a second person's review."""
    signed_lines = [
        (one.role, one.name, one.when, one.remark) for one in sample.sign_offs
    ]
    roles = {line[0] for line in signed_lines}
    blank = [(role, "", "", "") for role in ROLES if role not in roles]
    return (*signed_lines, *blank)


def _listed_shift(signal: ListedSignal, digits: int) -> str:
    if signal.low_ppm == signal.high_ppm:
        return fixed(signal.high_ppm, digits)
    return shift_range(signal.low_ppm, signal.high_ppm)


def advice_rows(ledger: Ledger) -> tuple[tuple[str, str], ...]:
    """Measurement and what to look for, the most telling first."""
    return tuple((one.measurement, outgoing(one.look_for)) for one in ledger.advice)


def geometry_rows(ledger: Ledger) -> tuple[str, ...]:
    """What the couplings say about the geometry, one sentence each."""
    if ledger.geometry is None:
        return ()
    return tuple(outgoing(one) for one in ledger.geometry.sentences)


def audit_rows(ledger: Ledger) -> tuple[tuple[str, str], ...]:
    """Name and value of everything a reader needs to repeat the result."""
    evidence = ledger.evidence
    metadata = evidence.metadata
    rows = [
        ("Source", metadata.source_name),
        ("SHA-256", metadata.sha256),
        ("Format", metadata.format_name),
        ("Acquired", metadata.acquired_on or "not in the file"),
        ("Scans", str(metadata.n_scans or "not in the file")),
        ("Pulse program", metadata.pulse_program or "not in the file"),
        ("Pulse angle", _measured(metadata.pulse_angle_deg, "°")),
        ("Delay between scans", _measured(metadata.relaxation_delay_s, "\u00a0s")),
        ("Reference", f"{evidence.reference.by}: {outgoing(evidence.reference.why)}"),
        ("Solvent seen", evidence.solvent_seen or "none"),
        ("Solvent in the file", evidence.solvent_header or "none"),
        ("Phase", _phase_words(evidence.quality.phase_sd_deg)),
        (
            "Baseline",
            f"{evidence.quality.baseline_sd:.1f} noise sd over the signal-free "
            "stretches; 1 is flat",
        ),
    ]
    doubts = (*metadata.notes, *evidence.quality.doubts)
    return (*rows, *(("Doubt", outgoing(doubt)) for doubt in doubts))


def _phase_words(sd_deg: float | None) -> str:
    if sd_deg is None:
        return "as it was given; not estimated"
    return f"estimated error {sd_deg:.1f}\u00a0degrees in the worst signal"


def _measured(value: float | None, unit: str) -> str:
    return "not in the file" if value is None else f"{value:g}{unit}"


def recipe_lines(ledger: Ledger) -> tuple[str, ...]:
    """Processing steps in order, one line each."""
    return tuple(_step_words(step) for step in ledger.evidence.recipe.steps)


def probability_words(ledger: Ledger) -> str:
    """Probability with its prior and likelihood ratio, or why there is none."""
    verdict = ledger.verdict
    if verdict.probability is None:
        return ""
    ratio = verdict.likelihood_ratio
    odds = "" if ratio is None else f", likelihood ratio {ratio:.3g}"
    return (
        f"probability {_probability(verdict.probability)} "
        f"(prior {verdict.prior:.2g}{odds})"
    )


def verdict_title(ledger: Ledger) -> str:
    """Outgoing words of the verdict."""
    return outgoing_verdict(ledger.verdict)


def largest_residual(entry: Entry) -> str:
    """Largest residual of an entry with its kind: J +0.9 sd."""
    kinds = (
        ("δ", entry.shift_residual_sd),
        ("J", entry.j_residual_sd),
        ("∫", entry.integral_residual_sd),
    )
    found = [(abs(value), name, value) for name, value in kinds if value is not None]
    if entry.shift_ppm is None or not found:
        return ""
    _, name, value = max(found)
    return f"{name} {signed(value, 1)} sd"


def couplings_text(entry: Entry) -> str:
    """Couplings with sd and partners, largest first; undetermined ones said so."""
    if entry.shift_ppm is None or not entry.couplings:
        return ""
    known = [one for one in entry.couplings if one.determined and one.j_hz is not None]
    known.sort(key=lambda one: -abs(one.j_hz or 0.0))
    parts = [_coupling_text(one) for one in known]
    unknown = [one for one in entry.couplings if one not in known]
    sums = [
        f"sum {fixed(abs(one.sum_hz), _J_DIGITS)} {label_glyphs(one.partner)}"
        for one in unknown
        if one.sum_hz is not None
    ]
    parts += list(dict.fromkeys(sums))
    silent = [label_glyphs(one.partner) for one in unknown if one.sum_hz is None]
    if silent:
        parts.append(f"not determined: {', '.join(dict.fromkeys(silent))}")
    return ", ".join(parts)


def _assignment_row(ledger: Ledger, entry: Entry) -> AssignmentRow:
    shift = (
        ""
        if entry.shift_ppm is None
        else with_sd(entry.shift_ppm, entry.shift_sd_ppm, digits=_SHIFT_DIGITS)
    )
    found = "" if entry.integral_protons is None else protons(entry.integral_protons)
    predicted = plus_minus(entry.predicted_shift_ppm, entry.predicted_shift_sd_ppm)
    return AssignmentRow(
        cells=(
            label_glyphs(entry.claim),
            shift,
            found,
            entry.multiplicity or "",
            outgoing(entry.why) if entry.state == "silent" else couplings_text(entry),
            predicted,
            largest_residual(entry),
            outgoing_state(ledger, entry),
        ),
        state=entry.state,
        notes=_notes(entry),
    )


def _notes(entry: Entry) -> tuple[str, ...]:
    notes = [*entry.reasons] if entry.state in ("disputed", "open") else []
    if entry.why and entry.state != "silent":
        notes.append(entry.why)
    group = entry.group
    if group is not None:
        partners = ", ".join(label_glyphs(one) for one in group.partners)
        if group.kind == "shared":
            notes.append(
                f"Shares its signal with {partners}; its part is from the fit."
            )
        else:
            odds = (
                "" if group.odds is None else f" (odds {group.odds:.2f} for this order)"
            )
            notes.append(f"Interchangeable with {partners}{odds}.")
    return tuple(outgoing(note) for note in dict.fromkeys(notes))


def _coupling_text(coupling: EntryCoupling) -> str:
    value = with_sd(abs(coupling.j_hz or 0.0), coupling.j_sd_hz, digits=_J_DIGITS)
    return f"{value}\u00a0{label_glyphs(coupling.partner)}"


def _stray_row(stray: Stray) -> tuple[str, ...]:
    size = "" if stray.protons is None else protons(stray.protons)
    return (
        f"{fixed(stray.high_ppm, 3)} to {fixed(stray.low_ppm, 3)}",
        stray.kind,
        size,
        outgoing(stray.why),
    )


def _contender_row(contender: Contender) -> tuple[str, ...]:
    result = "excluded" if contender.excluded else "not excluded"
    if contender.probability is not None:
        result += f", probability {_probability(contender.probability)}"
    return (
        _contender_name(contender),
        contender.origin,
        result,
        outgoing(contender.why),
    )


def _contender_name(contender: Contender) -> str:
    if not contender.name or contender.name == contender.smiles:
        return contender.smiles
    return f"{contender.name}: {contender.smiles}"


def _probability(value: float) -> str:
    if value < 0.001:
        return "under 0.001"
    return "over 0.999" if value > 0.999 else f"{value:.3g}"


def _step_words(step: object) -> str:
    """One processing step in plain words."""
    match step:
        case RemoveDelay():
            return f"Digital-filter delay of {step.group_delay_points:.6g} points taken out"
        case Apodize():
            return _window_words(step)
        case ZeroFill():
            return f"Filled with zeros to {step.n_points} complex points"
        case FourierTransform():
            half = ", first point halved" if step.halve_first_point else ""
            return f"Fourier transform{half}"
        case Phase():
            who = "automatic" if step.automatic else "by hand"
            return (
                f"Phase {fixed(step.phase0_deg, 1)}° and {fixed(step.phase1_deg, 1)}° "
                f"first order, {who}"
            )
        case Baseline():
            return _baseline_words(step)
        case Reference():
            return (
                f"Axis moved by {signed(step.offset_ppm, 4)} ppm, reference {step.by}, "
                f"sd {step.sd_ppm:.2g} ppm"
            )
    raise TypeError(f"step: no words for {type(step).__name__}")


def _window_words(step: Apodize) -> str:
    details = []
    if step.line_broadening_hz:
        details.append(f"{fixed(step.line_broadening_hz, 2)} Hz Lorentzian")
    if step.gaussian_hz:
        details.append(f"{fixed(step.gaussian_hz, 2)} Hz Gaussian")
    if step.kind == "sine_bell":
        details.append(
            f"power {step.sine_power:g}, start {fixed(step.sine_offset_deg, 0)}°"
        )
    name = step.kind.replace("_", " ")
    return f"Window {name}{': ' if details else ''}{', '.join(details)}"


def _baseline_words(step: Baseline) -> str:
    if step.method == "none":
        return "No baseline correction"
    return (
        f"Baseline {step.method}, stiffness {step.stiffness:.3g} on {step.n_bins} bins, "
        f"{len(step.masked_ppm)} stretches with signals left out"
    )
