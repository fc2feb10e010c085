"""Who sets the axis, told on spectra whose every line is known."""

from collections.abc import Sequence

import pytest

from known_fid import KnownLine, Setting, made_fid, multiplet
from spinledger.processing.automatic import ProcessedSpectrum, process

FIELD_MHZ = 500.0
SOLUTE = [
    *multiplet(6.81, [8.5], area=2.0),
    *multiplet(3.62, [7.1, 7.1], area=2.0),
    KnownLine(shift_ppm=2.31, area=3.0),
]


def satellites(line: KnownLine, one_bond_hz: float) -> list[KnownLine]:
    """13C satellites of 1.1 % at half the coupling on both sides."""
    half_ppm = one_bond_hz / 2 / FIELD_MHZ
    return [
        KnownLine(
            shift_ppm=line.shift_ppm + side * half_ppm,
            area=0.0054 * line.area,
            width_hz=line.width_hz,
        )
        for side in (-1, 1)
    ]


def moved(lines: Sequence[KnownLine], by_ppm: float) -> list[KnownLine]:
    """The same sample on an axis that is off."""
    return [
        KnownLine(
            shift_ppm=line.shift_ppm + by_ppm, area=line.area, width_hz=line.width_hz
        )
        for line in lines
    ]


def quintet(shift_ppm: float, splitting_hz: float, area: float) -> list[KnownLine]:
    """1:2:3:2:1, as two deuterons of spin one make it."""
    return [
        KnownLine(
            shift_ppm=shift_ppm + place * splitting_hz / FIELD_MHZ,
            area=area * ratio / 9,
            width_hz=0.5,
        )
        for place, ratio in zip(range(-2, 3), (1, 2, 3, 2, 1), strict=True)
    ]


def run(
    lines: Sequence[KnownLine], *, header: str | None = None, given: str | None = None
) -> ProcessedSpectrum:
    fid = made_fid(lines, Setting(noise_sd=0.004, n_samples=32768), solvent=header)
    return process(fid, solvent=given)


METHYLS = KnownLine(shift_ppm=0.0, area=0.9, width_hz=0.8)
DSS = [
    METHYLS,
    *satellites(METHYLS, 118.0),
    *multiplet(0.625, [8.3, 8.3], area=0.2),
    *multiplet(1.755, [7.9, 7.9, 7.9, 7.9], area=0.2),
    *multiplet(2.91, [7.8, 7.8], area=0.2),
]
HOD = KnownLine(shift_ppm=4.78, area=20.0, width_hz=2.0)
TMS = [METHYLS, *satellites(METHYLS, 118.0)]
CHLOROFORM = KnownLine(shift_ppm=7.26, area=0.8, width_hz=0.7)
CHLOROFORM_LINES = [CHLOROFORM, *satellites(CHLOROFORM, 209.0)]


def test_dss_is_proven_by_its_own_ch2_signals() -> None:
    processed = run(moved([*SOLUTE, *DSS, HOD], -0.13), header="D2O")
    reference = processed.referencing.reference
    assert reference.by == "DSS"
    assert "CH2" in reference.why
    # Position of one line of S/N 2000: well under a thousandth of a ppm.
    assert reference.offset_ppm == pytest.approx(0.13, abs=2e-4)
    assert reference.sd_ppm <= 0.001
    assert processed.referencing.solvent_seen == "D2O"


def test_a_standard_without_ch2_signals_may_be_tsp_and_says_so() -> None:
    processed = run(moved([*SOLUTE, *TMS, HOD], 0.08), header="D2O")
    reference = processed.referencing.reference
    assert reference.offset_ppm == pytest.approx(-0.08, abs=2e-4)
    # TSP stands 0.016 to 0.019 ppm from DSS at neutral pH.
    assert 0.005 <= reference.sd_ppm <= 0.02
    assert "TSP" in reference.why


def test_a_solute_singlet_near_zero_with_neighbours_upfield_is_no_standard() -> None:
    silyl = [KnownLine(shift_ppm=0.1, area=9.0), KnownLine(shift_ppm=-0.4, area=6.0)]
    processed = run([*SOLUTE, *silyl, HOD], header="D2O")
    reference = processed.referencing.reference
    # Only the outermost can be the standard; the other has a line upfield.
    assert reference.by != "DSS" or reference.offset_ppm == pytest.approx(0.4, abs=0.01)


def test_without_a_standard_water_says_it_to_a_tenth_of_a_ppm() -> None:
    processed = run([*SOLUTE, HOD], header="D2O")
    reference = processed.referencing.reference
    assert reference.by == "water"
    assert reference.sd_ppm == 0.1
    assert reference.line_ppm == pytest.approx(7.83 - 298.15 / 96.9, abs=1e-9)


def test_chloroform_is_proven_by_its_carbon_satellites() -> None:
    processed = run(moved([*SOLUTE, *CHLOROFORM_LINES], 0.027), header="CDCl3")
    reference = processed.referencing.reference
    assert reference.by == "solvent"
    assert reference.offset_ppm == pytest.approx(-0.027, abs=2e-4)
    assert reference.line_ppm == 7.26
    assert "satellites" in reference.why
    assert processed.referencing.solvent_seen == "CDCl3"


def test_an_aromatic_singlet_is_not_taken_for_chloroform() -> None:
    arene = KnownLine(shift_ppm=7.28, area=0.8, width_hz=0.7)
    processed = run([*SOLUTE, arene, *satellites(arene, 160.0)], header="CDCl3")
    assert processed.referencing.reference.by == "match"
    assert processed.referencing.solvent_seen is None
    assert processed.referencing.residual_ppm is None


def test_tms_wins_over_chloroform_that_has_moved() -> None:
    # Aromatics and hydrogen bonds move CHCl3; TMS stays.
    processed = run([*SOLUTE, *TMS, *moved(CHLOROFORM_LINES, 0.035)], header="CDCl3")
    reference = processed.referencing.reference
    assert reference.by == "TMS"
    assert reference.offset_ppm == pytest.approx(0.0, abs=2e-4)
    assert processed.referencing.residual_ppm == pytest.approx(7.295, abs=1e-3)


def test_silicone_grease_is_not_taken_for_tms() -> None:
    grease = moved(TMS, 0.07)
    processed = run([*SOLUTE, *grease, *CHLOROFORM_LINES], header="CDCl3")
    reference = processed.referencing.reference
    assert reference.by == "solvent"
    assert reference.offset_ppm == pytest.approx(0.0, abs=2e-4)


@pytest.mark.parametrize(
    ("solvent", "shift_ppm", "splitting_hz"),
    [
        ("DMSO-d6", 2.50, 1.9),
        ("acetone-d6", 2.05, 2.2),
        ("CD3OD", 3.31, 1.7),
        ("CD3CN", 1.94, 2.5),
    ],
)
def test_a_cd2h_quintet_names_the_solvent_without_a_header(
    solvent: str, shift_ppm: float, splitting_hz: float
) -> None:
    lines = [*SOLUTE[:2], *quintet(shift_ppm, splitting_hz, 0.8)]
    processed = run(moved(lines, 0.03))
    assert processed.referencing.solvent_seen == solvent
    reference = processed.referencing.reference
    assert reference.by == "solvent"
    assert reference.line_ppm == shift_ppm
    assert reference.offset_ppm == pytest.approx(-0.03, abs=5e-4)


def test_a_triplet_of_triplets_is_no_quintet() -> None:
    # 1:4:6:4:1 of two equal couplings of 1.9 Hz over four protons.
    pattern = multiplet(2.50, [1.9, 1.9, 1.9, 1.9], area=2.0, width_hz=0.5)
    processed = run([*SOLUTE[:2], *pattern])
    assert processed.referencing.solvent_seen is None


def test_a_header_that_disagrees_is_reported_not_believed() -> None:
    processed = run([*SOLUTE, *CHLOROFORM_LINES], header="DMSO")
    assert processed.referencing.solvent == "CDCl3"
    assert processed.solvent_header == "DMSO-d6"
    assert processed.quality.doubts[-1] == (
        "The header says DMSO-d6, but the spectrum shows CDCl3."
    )


def test_the_user_wins_over_spectrum_and_header_and_is_told() -> None:
    processed = run([*SOLUTE, *CHLOROFORM_LINES], header="CDCl3", given="MeOD")
    assert processed.referencing.solvent == "CD3OD"
    assert processed.referencing.solvent_seen == "CDCl3"
    assert any("CD3OD was given" in doubt for doubt in processed.quality.doubts)


def test_nothing_to_go_by_is_left_to_the_match() -> None:
    processed = run(SOLUTE, header="CDCl3")
    reference = processed.referencing.reference
    assert reference.by == "match"
    assert reference.offset_ppm == 0.0
    assert reference.sd_ppm == 0.05
