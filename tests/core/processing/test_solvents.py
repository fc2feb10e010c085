import csv

import pytest

from shared_data import shared
from spinledger.processing.presaturation import is_presaturated
from spinledger.processing.solvents import (
    canonical_solvent,
    hod_shift_ppm,
    impurity_lines,
    is_aqueous,
    is_protic_deuterated,
    residual_lines,
    solvent_names,
    water_lines,
)


@pytest.mark.parametrize(
    ("written", "canonical"),
    [
        ("D2O", "D2O"),
        ("Deuterium Oxide", "D2O"),
        ("heavy water", "D2O"),
        ("CDCl3", "CDCl3"),
        ("CHLOROFORM-d", "CDCl3"),
        ("chloroform", "CDCl3"),
        ("DMSO", "DMSO-d6"),
        ("dmso-D6", "DMSO-d6"),
        ("(CD3)2SO", "DMSO-d6"),
        ("d6-dmso", "DMSO-d6"),
        ("MeOD", "CD3OD"),
        ("METHANOL-D4", "CD3OD"),
        ("CD3OD", "CD3OD"),
        ("Acetone-d6", "acetone-d6"),
        ("(CD3)2CO", "acetone-d6"),
        ("BENZENE-d6", "C6D6"),
        ("C6D6", "C6D6"),
        ("CD3CN", "CD3CN"),
        ("acetonitrile-d3", "CD3CN"),
        ("H2O/D2O", "H2O/D2O"),
        ("H2O+D2O", "H2O/D2O"),
        ("90% H2O, 10% D2O", "H2O/D2O"),
        ("cd2cl2", "CD2Cl2"),
        ("THF-d8", "THF-d8"),
        ("Toluene-d8", "toluene-d8"),
        ("pyridine-d5", "pyridine-d5"),
    ],
)
def test_usual_names_are_known_in_any_case(written: str, canonical: str) -> None:
    assert canonical_solvent(written) == canonical


def test_canonical_names_are_their_own_names_and_others_are_unknown() -> None:
    assert all(canonical_solvent(name) == name for name in solvent_names())
    assert canonical_solvent("olive oil") is None
    assert canonical_solvent("") is None


def test_exchange_is_told_by_the_solvent() -> None:
    assert is_protic_deuterated("D2O")
    assert is_protic_deuterated("CD3OD")
    assert not is_protic_deuterated("CDCl3")
    assert not is_protic_deuterated("DMSO-d6")
    assert not is_protic_deuterated(None)
    assert is_aqueous("H2O/D2O")


def test_residual_lines_are_those_of_the_published_table() -> None:
    table = shared("reference", "residual_solvents.csv")
    with table.open(encoding="utf-8") as lines:
        rows = [row for row in csv.DictReader(lines) if row["species"] != "HOD"]
    for row in rows:
        ours = residual_lines(row["solvent"])
        assert any(
            line.shift_ppm == float(row["shift_1H_ppm"])
            and line.species == row["species"]
            for line in ours
        ), row


@pytest.mark.parametrize(
    ("solvent", "shift_ppm", "j_hz"),
    [("DMSO-d6", 2.50, 1.9), ("acetone-d6", 2.05, 2.2), ("CD3OD", 3.31, 1.7)],
)
def test_quintets_stand_where_fulmer_2010_puts_them(
    solvent: str, shift_ppm: float, j_hz: float
) -> None:
    # doi:10.1021/om100106e, Table 1; the splittings are common knowledge.
    line = next(one for one in residual_lines(solvent) if one.multiplicity == "quint")
    assert line.shift_ppm == shift_ppm
    assert line.j_hd_hz == j_hz


def test_hod_agrees_with_an_independent_calibration() -> None:
    # A laboratory calibration: HOD 4.7396 ppm from DSS at 300 K. Published
    # formulae scatter by some 0.01 ppm there.
    assert hod_shift_ppm(300.0) == pytest.approx(4.7396, abs=0.01)


@pytest.mark.parametrize("celsius", [5.0, 25.0, 45.0])
def test_hod_formulae_of_two_laboratories_agree_within_their_known_gap(
    celsius: float,
) -> None:
    # Gottlieb, Kotlyar, Nudelman 1997: 5.060 - 0.0122 t + 2.11e-5 t^2.
    other = 5.060 - 0.0122 * celsius + 2.11e-5 * celsius**2
    assert hod_shift_ppm(celsius + 273.15) == pytest.approx(other, abs=0.05)


def test_water_shows_as_the_solvent_makes_it() -> None:
    assert [one.species for one in water_lines("CDCl3")] == ["H2O"]
    assert water_lines("CDCl3")[0].shift_ppm == pytest.approx(1.56)
    for solvent, pair in (("acetone-d6", (2.84, 2.81)), ("DMSO-d6", (3.33, 3.30))):
        lines = water_lines(solvent)
        assert [one.species for one in lines] == ["H2O", "HOD"]
        assert tuple(one.shift_ppm for one in lines) == pair
    assert (
        water_lines("D2O", 310.0)[0].shift_ppm < water_lines("D2O", 290.0)[0].shift_ppm
    )
    assert water_lines("D2O")[0].sd_ppm == 0.1
    assert water_lines(None) == ()


def test_impurities_come_with_all_their_lines() -> None:
    ethyl_acetate = [
        line for line in impurity_lines("CDCl3") if line.compound == "ethyl acetate"
    ]
    # Fulmer 2010, Table 1: 2.05 s, 4.12 q 7, 1.26 t 7.
    assert sorted((line.shift_ppm, line.multiplicity) for line in ethyl_acetate) == [
        (1.26, "t"),
        (2.05, "s"),
        (4.12, "q"),
    ]
    assert all(line.couplings_hz in ((7.0,), ()) for line in ethyl_acetate)


def test_doubted_rows_and_water_are_not_used() -> None:
    names = {line.compound for line in impurity_lines("CD3OD")}
    assert "water" not in names
    # 2-propanol's 1.50 ppm in CD3OD looks misprinted in the source.
    assert not any(
        line.compound == "2-propanol" and line.shift_ppm == 1.50
        for line in impurity_lines("CD3OD")
    )
    assert impurity_lines("H2O/D2O") == impurity_lines("D2O")
    assert impurity_lines(None) == ()


@pytest.mark.parametrize(
    "name",
    [
        "zgpr",
        "zgcppr",
        "noesygppr1d",
        "zgesgp",
        "p3919gp",
        "cpmgpr1d",
        "metnoesy",
        "PRESAT",
        "wet1d",
        "zggpw5",
        "watergate.c",
        "zgpr.user",
    ],
)
def test_water_suppression_is_told_by_the_pulse_program(name: str) -> None:
    assert is_presaturated(name)


@pytest.mark.parametrize(
    "name", ["zg", "zg30", "zg30.dj", "s2pul", "single", "zgpg30", None]
)
def test_plain_pulses_are_not_taken_for_suppression(name: str | None) -> None:
    assert not is_presaturated(name)
