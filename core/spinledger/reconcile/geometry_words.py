"""Sentences on populations and relative configuration; J in Hz, angles in degrees."""

from __future__ import annotations

from collections.abc import Sequence

from spinledger.values.geometry import ConfigurationOdds, DihedralShare

#: A share is worth a sentence when its sd is below this.
DETERMINED_SD = 0.15
CLEAR_SHARE = 0.75
FAVOURED_ODDS = 3.0


def geometry_sentences(
    dihedrals: Sequence[DihedralShare], configurations: Sequence[ConfigurationOdds]
) -> tuple[str, ...]:
    """What the couplings say, relative configuration first."""
    said = [_configuration_sentence(configurations)]
    said += [_dihedral_sentence(one) for one in dihedrals]
    return tuple(sentence for sentence in said if sentence)


def _configuration_sentence(rows: Sequence[ConfigurationOdds]) -> str:
    if len(rows) < 2:
        return ""
    best, second = rows[0], rows[1]
    odds = best.probability / max(second.probability, 1e-9)
    drawn = next((one for one in rows if one.is_drawn), None)
    if odds < FAVOURED_ODDS:
        return (
            f"the couplings do not decide between {_named(best)} and {_named(second)}: "
            f"odds {odds:.1f} to 1"
        )
    said = (
        f"the couplings favour {_named(best)} over {_named(second)} by "
        f"{_odds(odds)} to 1"
    )
    if drawn is not None and drawn not in (best, second):
        against = best.probability / max(drawn.probability, 1e-9)
        said += f", and over the drawn configuration by {_odds(against)} to 1"
    return said + " (relative configuration only)"


def _named(one: ConfigurationOdds) -> str:
    if one.is_drawn and one.name != "as drawn":
        return f"{one.name} (as drawn)"
    if one.name == "as drawn":
        return "the drawn configuration"
    return one.name


def _odds(value: float) -> str:
    return f"{value:.0f}" if value >= 10 else f"{value:.1f}"


def _dihedral_sentence(one: DihedralShare) -> str:
    j_hz = f"J({one.first}, {one.second}) = {one.j_hz:.1f} Hz"
    if one.anti_share_sd > DETERMINED_SD:
        return ""
    share, sd = 100.0 * one.anti_share, 100.0 * max(one.anti_share_sd, 0.01)
    if one.is_in_ring:
        if one.anti_share > CLEAR_SHARE:
            return (
                f"{j_hz}: antiperiplanar in the ring, {one.angle_deg:.0f} ± "
                f"{one.angle_sd_deg:.0f}°, {share:.0f} ± {sd:.0f} %"
            )
        return (
            f"{j_hz}: {one.angle_deg:.0f} ± {one.angle_sd_deg:.0f}° in the ring, "
            f"{share:.0f} ± {sd:.0f} % antiperiplanar"
        )
    return (
        f"{j_hz}: {share:.0f} ± {sd:.0f} % antiperiplanar "
        f"(force field {100.0 * one.prior_anti_share:.0f} %)"
    )
