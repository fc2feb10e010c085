"""The lines of a spectrum as a table, and what a ruler between two places says."""

from __future__ import annotations

from spinledger.values.evidence import Evidence, Signal
from spinledger_app.presenters.wording import number, say


def line_head() -> tuple[str, ...]:
    """Names of the columns."""
    return (
        say("Signal"),
        "δ, ppm",
        say("sd, ppm"),
        "Hz",
        say("Width, Hz"),
        say("Area, %"),
        say("To next, Hz"),
    )


def line_rows(evidence: Evidence) -> list[tuple[str, ...]]:
    """Every line of every signal from high to low shift.

    The area is that of the whole signal's, in percent; the last column is the
    distance to the next line of the same signal.
    """
    frequency_mhz = evidence.spectrum.spectrometer_frequency_mhz
    signals = sorted(evidence.signals, key=lambda one: -one.high_ppm)
    rows: list[tuple[str, ...]] = []
    for number_of_signal, signal in enumerate(signals, start=1):
        rows += _rows(signal, number_of_signal, frequency_mhz)
    return rows


def _rows(
    signal: Signal, number_of_signal: int, frequency_mhz: float
) -> list[tuple[str, ...]]:
    lines = sorted(signal.lines, key=lambda one: -one.shift_ppm)
    total = sum(line.area for line in lines) or 1.0
    rows: list[tuple[str, ...]] = []
    for index, line in enumerate(lines):
        gap = ""
        if index + 1 < len(lines):
            gap_ppm = line.shift_ppm - lines[index + 1].shift_ppm
            gap = number(gap_ppm * frequency_mhz, 2)
        rows.append(
            (
                str(number_of_signal),
                number(line.shift_ppm, 4),
                f"{line.shift_sd_ppm:.5f}",
                number(line.shift_ppm * frequency_mhz, 2),
                number(line.width_hz, 2),
                number(100.0 * line.area / total, 1),
                gap,
            )
        )
    return rows


def line_tsv(evidence: Evidence) -> str:
    """The table for a spreadsheet; plain minus signs."""
    rows = [line_head(), *line_rows(evidence)]
    text = "\n".join("\t".join(row) for row in rows) + "\n"
    return text.replace("\N{MINUS SIGN}", "-")


def ruler_text(low_ppm: float, high_ppm: float, frequency_mhz: float) -> str:
    """Distance between two places of the axis."""
    width_ppm = high_ppm - low_ppm
    return f"{number(width_ppm * frequency_mhz, 2)} Hz   {number(width_ppm, 4)} ppm"


def region_text(low_ppm: float, high_ppm: float, frequency_mhz: float) -> str:
    """What the status row says of a marked region."""
    return (
        say("{0} to {1} ppm: {2}")
        .replace("{0}", number(high_ppm, 4))
        .replace("{1}", number(low_ppm, 4))
        .replace("{2}", ruler_text(low_ppm, high_ppm, frequency_mhz))
    )
