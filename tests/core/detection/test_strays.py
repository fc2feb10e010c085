"""Labels of lines that belong to no structure, on made spectra with known lines."""

import re

import pytest

from known_fid import KnownLine, Setting, made_fid, multiplet
from spinledger.detection.evidence import gather_evidence
from spinledger.values.evidence import Evidence

FIELD_MHZ = 500.0
SINGLETS = (
    KnownLine(shift_ppm=3.6, area=3.0),
    KnownLine(shift_ppm=2.04, area=3.0),
)
SOLUTE = (
    *multiplet(1.25, [7.0, 7.0], area=3.0),
    *multiplet(4.1, [7.0, 7.0, 7.0], area=2.0),
    *SINGLETS,
)


def pair_about(line: KnownLine, distance_hz: float, share: float) -> list[KnownLine]:
    """Two weak lines at one distance on both sides of a line."""
    return [
        KnownLine(
            shift_ppm=line.shift_ppm + side * distance_hz / FIELD_MHZ,
            area=line.area * share,
            width_hz=line.width_hz,
        )
        for side in (-1, 1)
    ]


def labelled(evidence: Evidence, kind: str, shift_ppm: float) -> bool:
    return any(
        one.kind == kind and one.low_ppm < shift_ppm < one.high_ppm
        for one in evidence.strays
    )


def test_carbon_satellites_are_labelled_with_their_coupling() -> None:
    weak = [one for line in SINGLETS for one in pair_about(line, 70.0, 0.0055)]
    evidence = gather_evidence(made_fid([*SOLUTE, *weak], Setting(noise_sd=0.02)))
    assert all(labelled(evidence, "satellite", one.shift_ppm) for one in weak)
    assert not any(labelled(evidence, "satellite", one.shift_ppm) for one in SOLUTE)
    words = [one.why for one in evidence.strays if one.kind == "satellite"]
    assert all("1J(CH) 140 Hz" in one for one in words)


def test_a_satellite_of_the_standard_is_not_said_to_stand_at_minus_zero() -> None:
    standard = KnownLine(shift_ppm=-0.0002, area=3.0)
    lines = [*SOLUTE, standard, *pair_about(standard, 59.0, 0.0055)]
    evidence = gather_evidence(made_fid(lines, Setting(noise_sd=0.01), solvent="CDCl3"))
    assert not any(re.search(r"-0\.0+\b", one.why) for one in evidence.strays)


@pytest.mark.parametrize("rate_hz", [14.0, 20.0, 33.0])
def test_spinning_sidebands_stand_at_one_distance_from_several_lines(
    rate_hz: float,
) -> None:
    weak = [one for line in SINGLETS for one in pair_about(line, rate_hz, 0.01)]
    evidence = gather_evidence(made_fid([*SOLUTE, *weak], Setting(noise_sd=0.02)))
    assert all(labelled(evidence, "sideband", one.shift_ppm) for one in weak)
    assert not any(labelled(evidence, "sideband", one.shift_ppm) for one in SOLUTE)


def test_weak_lines_at_different_distances_are_no_sidebands() -> None:
    weak = [*pair_about(SINGLETS[0], 14.0, 0.01), *pair_about(SINGLETS[1], 21.0, 0.01)]
    evidence = gather_evidence(made_fid([*SOLUTE, *weak], Setting(noise_sd=0.02)))
    assert not any(one.kind == "sideband" for one in evidence.strays)


def test_second_sidebands_are_labelled_where_the_first_are() -> None:
    first = [one for line in SINGLETS for one in pair_about(line, 24.0, 0.01)]
    second = [one for line in SINGLETS for one in pair_about(line, 48.0, 0.003)]
    lines = [*SOLUTE, *first, *second]
    evidence = gather_evidence(made_fid(lines, Setting(noise_sd=0.02)))
    assert all(labelled(evidence, "sideband", one.shift_ppm) for one in second)


def test_water_in_d2o_is_labelled_and_a_solute_line_beside_it_is_not() -> None:
    water = KnownLine(shift_ppm=4.78, area=900.0, width_hz=3.0)
    beside = KnownLine(shift_ppm=4.3, area=1.0)
    standard = KnownLine(shift_ppm=0.0, area=0.5)
    setting = Setting(noise_sd=0.02, n_samples=32768, carrier_ppm=4.75)
    fid = made_fid([*SOLUTE, beside, standard, water], setting, solvent="D2O")
    evidence = gather_evidence(fid)
    assert labelled(evidence, "water", 4.78)
    assert labelled(evidence, "reference", 0.0)
    for one in (*SOLUTE, beside):
        assert not labelled(evidence, "water", one.shift_ppm)
