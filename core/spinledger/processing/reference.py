"""Choice of the reference line and of the solvent; shifts in ppm."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spinledger.lines.clusters import cluster_lines
from spinledger.lines.picking import Picks
from spinledger.processing.residual import (
    CHLOROFORM_PPM,
    Chloroform,
    Quintet,
    chloroform_candidates,
    quintets,
    solvent_of_quintet,
)
from spinledger.processing.solvents import (
    ResidualLine,
    is_aqueous,
    residual_lines,
    water_lines,
)
from spinledger.processing.standard import StandardCandidate, standard_candidates
from spinledger.values.recipe import Reference
from spinledger.values.spectrum import Spectrum

_ACCEPT_IN_WATER = 1.6
_ACCEPT_ELSEWHERE = 2.5
_AGREEMENT_PPM = 0.02
# Grease and other silicones stand here above TMS and look like it.
_SILICONE_PPM = (0.04, 0.12)
# Raw axes miss the truth by this much: 0.07 to 0.22 in water, 0.03 to 0.09 elsewhere.
_AQUEOUS_HEADER_SD_PPM = 0.12
_HEADER_SD_PPM = 0.05
_MAKER_SD_PPM = 0.03
_UNKNOWN_CARRIER_SD_PPM = 1.0
_USUAL_CARRIER_PPM = 4.8
# DSS against TSP at neutral pH: 0.016 to 0.019 ppm, Wishart 1995 (from memory).
_DSS_OR_TSP_SD_PPM = 0.01
_DSS_SD_PPM = 0.0005
_TMS_SD_PPM = 0.001
_RESIDUAL_SD_PPM = 0.005
_RESIDUAL_UNPROVEN_SD_PPM = 0.02
_LIKELY_CHLOROFORM_PPM = 0.06
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
    has_axis : bool
        The file says where the carrier is.
    """

    given: str | None = None
    header: str | None = None
    temperature_k: float | None = None
    is_maker_axis: bool = False
    has_axis: bool = True

    @property
    def axis_guess_ppm(self) -> float:
        """What to add to the axis before anything is seen, ppm."""
        return 0.0 if self.has_axis else _USUAL_CARRIER_PPM

    @property
    def axis_sd_ppm(self) -> float:
        """How far the header's axis may be off, ppm."""
        if not self.has_axis:
            return _UNKNOWN_CARRIER_SD_PPM
        if self.is_maker_axis:
            return _MAKER_SD_PPM
        aqueous = is_aqueous(self.given or self.header)
        return _AQUEOUS_HEADER_SD_PPM if aqueous else _HEADER_SD_PPM


@dataclass(frozen=True, slots=True, kw_only=True)
class Referencing:
    """The reference chosen and the solvent that is used.

    Attributes
    ----------
    reference : Reference
    solvent, solvent_seen : str or None
    residual_ppm : float or None, ppm
        Where the solvent's CHCl3 or CD2H line was recognised, on the new axis.
    doubts : tuple of str
    """

    reference: Reference
    solvent: str | None
    solvent_seen: str | None
    residual_ppm: float | None = None
    doubts: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class _Sightings:
    standards: tuple[StandardCandidate, ...]
    chloroforms: tuple[Chloroform, ...]
    quintet: Quintet | None
    quintet_line: ResidualLine | None


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
    seen = _sightings(spectrum, picks, facts)
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
        residual_ppm=_residual_ppm(seen, solvent, reference.offset_ppm),
        doubts=doubts,
    )


def _residual_ppm(
    seen: _Sightings, solvent: str | None, offset_ppm: float
) -> float | None:
    """Place of the solvent's own line, where it is one beyond doubt."""
    line = seen.quintet_line
    if seen.quintet is not None and line is not None and line.solvent == solvent:
        return seen.quintet.shift_ppm + offset_ppm
    if solvent != "CDCl3":
        return None
    proven = [one for one in seen.chloroforms if one.is_proven]
    likely = [
        one
        for one in seen.chloroforms
        if one.is_likely
        and abs(one.shift_ppm + offset_ppm - CHLOROFORM_PPM) < _LIKELY_CHLOROFORM_PPM
    ]
    chosen = proven or (likely if len(likely) == 1 else [])
    return chosen[0].shift_ppm + offset_ppm if chosen else None


def _sightings(spectrum: Spectrum, picks: Picks, facts: SolventFacts) -> _Sightings:
    clusters = cluster_lines(picks, step_hz=spectrum.step_hz)
    guess, reach = facts.axis_guess_ppm, 0.0 if facts.has_axis else 2.0
    standards = standard_candidates(
        spectrum, clusters, centre_ppm=-guess, reach_ppm=reach
    )
    if not facts.has_axis:
        standards = tuple(
            one for one in standards if one.has_dss_chain or one.has_carbon_satellites
        )
    chloroforms = chloroform_candidates(
        spectrum, clusters, offset_ppm=guess, reach_ppm=reach
    )
    combs = quintets(spectrum, picks, offset_ppm=guess, reach_ppm=reach)
    quintet, line = _named_quintet(combs, facts)
    return _Sightings(
        standards=standards,
        chloroforms=chloroforms,
        quintet=quintet,
        quintet_line=line,
    )


def _named_quintet(
    combs: tuple[Quintet, ...], facts: SolventFacts
) -> tuple[Quintet | None, ResidualLine | None]:
    for comb in combs:
        line = solvent_of_quintet(
            comb,
            offset_ppm=facts.axis_guess_ppm,
            offset_sd_ppm=max(facts.axis_sd_ppm, 0.06),
            favoured=facts.given or facts.header,
        )
        if line is not None:
            return comb, line
    return None, None


def _solvent_seen(seen: _Sightings, facts: SolventFacts) -> str | None:
    """What the spectrum itself says, or None where it does not."""
    if any(one.is_proven for one in seen.chloroforms):
        return "CDCl3"
    if seen.quintet_line is not None:
        return seen.quintet_line.solvent
    if seen.standards and seen.standards[0].has_dss_chain:
        return facts.header if is_aqueous(facts.header) else "D2O"
    chloroform = _likely_chloroform(seen, facts)
    if chloroform is None or is_aqueous(facts.header):
        return None
    agrees = any(
        abs(chloroform.shift_ppm - one.shift_ppm - CHLOROFORM_PPM) < _AGREEMENT_PPM
        for one in seen.standards
    )
    # A header that names a solvent with a quintet, which is not there, is wrong.
    missed = any(line.multiplicity == "quint" for line in residual_lines(facts.header))
    return "CDCl3" if agrees or missed else None


def _likely_chloroform(seen: _Sightings, facts: SolventFacts) -> Chloroform | None:
    """The one lone line near 7.26 ppm; None where there are several or none."""
    if not facts.has_axis:
        return None
    likely = [
        one
        for one in seen.chloroforms
        if one.is_likely
        and abs(one.shift_ppm - CHLOROFORM_PPM) < _LIKELY_CHLOROFORM_PPM
    ]
    return likely[0] if len(likely) == 1 else None


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
    apart = shifts + facts.axis_guess_ppm - water.shift_ppm
    near = np.abs(apart) < max(_WATER_HALF_PPM, facts.axis_sd_ppm)
    if near.any():
        line = float(shifts[int(np.argmax(picks.heights * near))])
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
    for candidate in seen.standards:
        if _is_tetramethylsilane(candidate, residual, facts):
            return _at_zero(candidate, "TMS", _TMS_SD_PPM, _why_tms(candidate))
    return residual if residual is not None else _from_header(facts)


def _is_tetramethylsilane(
    candidate: StandardCandidate, residual: Reference | None, facts: SolventFacts
) -> bool:
    """Whether a line near 0 ppm may set the axis.

    Its 13C satellites prove a silicon methyl; a silicone 0.04 to 0.12 ppm above
    zero has them too, which the solvent's residual line tells.
    """
    proven = candidate.has_carbon_satellites and candidate.score > _ACCEPT_ELSEWHERE
    if residual is None:
        apart = candidate.shift_ppm + facts.axis_guess_ppm
        near = abs(apart) < 3 * facts.axis_sd_ppm
        return proven or (candidate.score > _ACCEPT_ELSEWHERE and near)
    apart = candidate.shift_ppm + residual.offset_ppm
    if proven:
        return not _SILICONE_PPM[0] < apart < _SILICONE_PPM[1]
    return abs(apart) < _AGREEMENT_PPM


def _why_tms(candidate: StandardCandidate) -> str:
    if candidate.has_carbon_satellites:
        return "TMS, with the 13C satellites of a silicon methyl group."
    return "A singlet where TMS is expected, alone and upfield of all else."


def _residual_reference(
    seen: _Sightings, solvent: str | None, facts: SolventFacts
) -> Reference | None:
    quintet, line = seen.quintet, seen.quintet_line
    if quintet is not None and line is not None and line.solvent == solvent:
        return Reference(
            offset_ppm=line.shift_ppm - quintet.shift_ppm,
            by="solvent",
            sd_ppm=_RESIDUAL_SD_PPM,
            line_ppm=line.shift_ppm,
            why=f"The CD2H quintet of {solvent}, J(HD) {quintet.splitting_hz:.1f} Hz.",
        )
    if solvent != "CDCl3":
        return None
    proven = next((one for one in seen.chloroforms if one.is_proven), None)
    if proven is not None:
        return _at_chloroform(
            proven, _RESIDUAL_SD_PPM, "CHCl3, proven by its 13C satellites."
        )
    likely = _likely_chloroform(seen, facts)
    if likely is not None and not facts.is_maker_axis:
        return _at_chloroform(
            likely,
            _RESIDUAL_UNPROVEN_SD_PPM,
            "The one lone singlet where CHCl3 is expected.",
        )
    return None


def _at_chloroform(line: Chloroform, sd_ppm: float, why: str) -> Reference:
    return Reference(
        offset_ppm=CHLOROFORM_PPM - line.shift_ppm,
        by="solvent",
        sd_ppm=sd_ppm,
        line_ppm=CHLOROFORM_PPM,
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
            sd_ppm=facts.axis_sd_ppm,
            why="No reference line is recognised; the axis is the file's own.",
        )
    return Reference(
        offset_ppm=facts.axis_guess_ppm,
        by="match",
        sd_ppm=facts.axis_sd_ppm,
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
