"""Choice of the reference line and of the solvent; shifts in ppm."""

from __future__ import annotations

from dataclasses import dataclass

from spinledger.lines.clusters import cluster_lines
from spinledger.lines.picking import Picks
from spinledger.processing.residual import (
    QUINTET_MOST,
    Chloroform,
    Quintet,
    chloroform_candidates,
    quintets,
    solvent_of_quintet,
)
from spinledger.processing.solvents import is_aqueous, residual_lines, water_lines
from spinledger.processing.standard import StandardCandidate, standard_candidates
from spinledger.values.recipe import Reference
from spinledger.values.spectrum import Spectrum

_ACCEPT_IN_WATER = 1.6
_ACCEPT_ELSEWHERE = 2.5
_AGREEMENT_PPM = 0.02
_HEADER_SD_PPM = 0.1
_MAKER_SD_PPM = 0.03
# DSS against TSP at neutral pH: 0.016 to 0.019 ppm, Wishart 1995 (from memory).
_DSS_OR_TSP_SD_PPM = 0.01
_DSS_SD_PPM = 0.0005
_TMS_SD_PPM = 0.001
_RESIDUAL_SD_PPM = 0.005
_RESIDUAL_UNPROVEN_SD_PPM = 0.01
_WATER_SD_PPM = 0.1
_WATER_HALF_PPM = 0.25


@dataclass(frozen=True, slots=True, kw_only=True)
class SolventFacts:
    """What is known of the solvent before the spectrum is asked.

    Attributes
    ----------
    given : str or None
        By the user, canonical.
    header : str or None
        By the file, canonical where known.
    temperature_k : float or None, K
    is_maker_axis : bool
        The axis was set by whoever processed the spectrum.
    """

    given: str | None = None
    header: str | None = None
    temperature_k: float | None = None
    is_maker_axis: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Referencing:
    """The reference chosen and the solvent that is used.

    Attributes
    ----------
    reference : Reference
    solvent, solvent_seen : str or None
    doubts : tuple of str
    """

    reference: Reference
    solvent: str | None
    solvent_seen: str | None
    doubts: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class _Sightings:
    standards: tuple[StandardCandidate, ...]
    chloroform: Chloroform | None
    quintet: Quintet | None
    quintet_solvent: str | None


def choose_reference(
    spectrum: Spectrum, picks: Picks, *, facts: SolventFacts
) -> Referencing:
    """Who sets the zero of the axis, and how sure that is.

    Parameters
    ----------
    spectrum : Spectrum
        Phased and flat, on the header's axis.
    picks : Picks
        Its lines.
    facts : SolventFacts
    """
    seen = _sightings(spectrum, picks)
    solvent_seen = _solvent_seen(seen, facts)
    solvent = facts.given or solvent_seen or facts.header
    if is_aqueous(solvent):
        reference = _aqueous(spectrum, picks, seen, solvent, facts)
    else:
        reference = _organic(seen, solvent, facts)
    doubts = _conflicts(facts, solvent_seen)
    return Referencing(
        reference=reference,
        solvent=solvent,
        solvent_seen=solvent_seen,
        doubts=doubts,
    )


def _sightings(spectrum: Spectrum, picks: Picks) -> _Sightings:
    clusters = cluster_lines(picks, step_hz=spectrum.step_hz)
    standards = standard_candidates(spectrum, clusters)
    chloroforms = chloroform_candidates(spectrum, clusters)
    combs = [one for one in quintets(spectrum, picks) if one.figure < QUINTET_MOST]
    quintet, name = None, None
    for comb in combs:
        line = solvent_of_quintet(comb, offset_ppm=0.0, offset_sd_ppm=0.06)
        if line is not None:
            quintet, name = comb, line.solvent
            break
    return _Sightings(
        standards=standards,
        chloroform=chloroforms[0] if chloroforms else None,
        quintet=quintet,
        quintet_solvent=name,
    )


def _solvent_seen(seen: _Sightings, facts: SolventFacts) -> str | None:
    if seen.chloroform is not None and seen.chloroform.is_proven:
        return "CDCl3"
    if seen.quintet_solvent is not None:
        return seen.quintet_solvent
    if seen.standards and seen.standards[0].has_dss_chain:
        aqueous = is_aqueous(facts.header)
        return facts.header if aqueous else "D2O"
    chloroform = seen.chloroform
    if (
        chloroform is not None
        and chloroform.is_clean
        and _agrees(seen.standards, 7.26, chloroform.shift_ppm)
    ):
        return "CDCl3"
    return None


def _agrees(
    standards: tuple[StandardCandidate, ...], table_ppm: float, seen_ppm: float
) -> bool:
    return any(
        abs(seen_ppm - one.shift_ppm - table_ppm) < _AGREEMENT_PPM for one in standards
    )


def _aqueous(
    spectrum: Spectrum,
    picks: Picks,
    seen: _Sightings,
    solvent: str | None,
    facts: SolventFacts,
) -> Reference:
    best = seen.standards[0] if seen.standards else None
    if best is not None and best.score >= _ACCEPT_IN_WATER:
        if best.has_dss_chain:
            return _at_zero(
                best, "DSS", _DSS_SD_PPM, "DSS, proven by its own CH2 signals."
            )
        return _at_zero(
            best,
            "DSS",
            _DSS_OR_TSP_SD_PPM,
            "A standard's singlet; DSS and TSP cannot be told apart without the "
            "CH2 signals, which are not seen.",
        )
    water = water_lines(solvent, facts.temperature_k)[0]
    shifts = spectrum.first_point_ppm - spectrum.step_ppm * picks.points
    near = abs(shifts - water.shift_ppm) < _WATER_HALF_PPM
    if near.any():
        heights = picks.heights * near
        line = float(shifts[heights.argmax()])
        return Reference(
            offset_ppm=water.shift_ppm - line,
            by="water",
            sd_ppm=_WATER_SD_PPM,
            line_ppm=water.shift_ppm,
            why="No standard is seen; the tallest line near HOD is put to where "
            "the temperature says, which is good to 0.1 ppm.",
        )
    return _from_header(facts)


def _organic(seen: _Sightings, solvent: str | None, facts: SolventFacts) -> Reference:
    residual = _residual_reference(seen, solvent, facts)
    best = seen.standards[0] if seen.standards else None
    for candidate in seen.standards:
        if residual is None:
            break
        if abs(-candidate.shift_ppm - residual.offset_ppm) < _AGREEMENT_PPM:
            return _at_zero(
                candidate,
                "TMS",
                _TMS_SD_PPM,
                "TMS, in agreement with the solvent's residual line.",
            )
    if residual is not None:
        return residual
    if best is not None and best.score > _ACCEPT_ELSEWHERE:
        return _at_zero(
            best, "TMS", _TMS_SD_PPM, "A singlet with the marks of TMS near 0 ppm."
        )
    return _from_header(facts)


def _residual_reference(
    seen: _Sightings, solvent: str | None, facts: SolventFacts
) -> Reference | None:
    if seen.quintet is not None and seen.quintet_solvent == solvent:
        table = next(
            line for line in residual_lines(solvent) if line.multiplicity == "quint"
        )
        return Reference(
            offset_ppm=table.shift_ppm - seen.quintet.shift_ppm,
            by="solvent",
            sd_ppm=_RESIDUAL_SD_PPM,
            line_ppm=table.shift_ppm,
            why=f"The CD2H quintet of {solvent} (J {seen.quintet.splitting_hz:.1f} Hz).",
        )
    chloroform = seen.chloroform
    if solvent != "CDCl3" or chloroform is None:
        return None
    if chloroform.is_proven:
        return _at_chloroform(
            chloroform, _RESIDUAL_SD_PPM, "CHCl3, proven by its 13C satellites."
        )
    if chloroform.is_clean and not facts.is_maker_axis:
        return _at_chloroform(
            chloroform,
            _RESIDUAL_UNPROVEN_SD_PPM,
            "A lone singlet where CHCl3 is expected.",
        )
    return None


def _at_chloroform(line: Chloroform, sd_ppm: float, why: str) -> Reference:
    return Reference(
        offset_ppm=7.26 - line.shift_ppm,
        by="solvent",
        sd_ppm=sd_ppm,
        line_ppm=7.26,
        why=why,
    )


def _at_zero(
    candidate: StandardCandidate, by: str, sd_ppm: float, why: str
) -> Reference:
    return Reference(
        offset_ppm=-candidate.shift_ppm, by=by, sd_ppm=sd_ppm, line_ppm=0.0, why=why
    )


def _from_header(facts: SolventFacts) -> Reference:
    if facts.is_maker_axis:
        return Reference(
            offset_ppm=0.0,
            by="header",
            sd_ppm=_MAKER_SD_PPM,
            why="No reference line is recognised; the axis is the file's own.",
        )
    return Reference(
        offset_ppm=0.0,
        by="match",
        sd_ppm=_HEADER_SD_PPM,
        why="No reference line is recognised; the match estimates the offset.",
    )


def _conflicts(facts: SolventFacts, solvent_seen: str | None) -> tuple[str, ...]:
    doubts = []
    if solvent_seen and facts.header and facts.header != solvent_seen:
        doubts.append(
            f"The header says {facts.header}, but the spectrum shows {solvent_seen}."
        )
    if solvent_seen and facts.given and facts.given != solvent_seen:
        doubts.append(
            f"{facts.given} was given as the solvent, but the spectrum shows "
            f"{solvent_seen}."
        )
    return tuple(doubts)
