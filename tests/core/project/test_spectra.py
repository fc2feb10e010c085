"""Several spectra of one sample in a project: roles, showing, storage."""

from dataclasses import replace
from pathlib import Path

import pytest

from invented_ledger import invented_fid, overlapped_ledger
from spinledger.project.codec import Encoder, decode
from spinledger.project.document import Project, open_structure, with_ledger
from spinledger.project.edits import PinClaim, RenameLabel, apply_edit
from spinledger.project.spectra import (
    add_spectrum,
    main_spectrum,
    remove_spectrum,
    set_conditions,
    set_role,
    show_spectrum,
    spectra,
    spectrum_of,
    step_spectrum,
)
from spinledger.project.storage import load_project, save_project
from spinledger.sample.roles import guess_role
from spinledger.values.acquisition import Fid, Metadata

WHEN = "2026-12-01T10:00:00+01:00"


def fid(**changes: object) -> Fid:
    plain = invented_fid()
    metadata = replace(plain.metadata, **changes)  # type: ignore[arg-type]  # test data
    return replace(plain, metadata=metadata)


def two_spectra() -> Project:
    ledger = overlapped_ledger()
    project = add_spectrum(Project(), fid(sha256="a" * 64), source_path="/x", when=WHEN)
    project = open_structure(project, ledger.structure, when=WHEN)
    project = with_ledger(project, ledger, when=WHEN)
    shaken = fid(sha256="b" * 64, source_name="tube_d2o_shake")
    return add_spectrum(project, shaken, source_path="/y", when=WHEN)


def metadata(**changes: object) -> Metadata:
    plain = Metadata(
        source_name="7", sha256="", format_name="", nucleus="1H",
        spectrometer_frequency_mhz=400.13, solvent="CDCl3", temperature_k=298.0,
        acquired_on="2026-10-01",
    )  # fmt: skip
    return replace(plain, **changes)  # type: ignore[arg-type]  # test data


@pytest.mark.parametrize(
    ("changes", "role"),
    [
        ({"title": "the same after a shake with heavy water"}, "D2O shake"),
        ({"source_name": "B117 + D2O"}, "D2O shake"),
        ({"solvent": "DMSO-d6"}, "other solvent"),
        ({"spectrometer_frequency_mhz": 600.13}, "other field"),
        ({"temperature_k": 340.0}, "other temperature"),
        ({"title": "B117 crude, before column"}, "crude"),
        ({"source_name": "B117_SM"}, "starting material"),
        ({"source_name": "ref_batch_12"}, "reference"),
        ({"acquired_on": "2025-10-01"}, "reference"),
    ],
)
def test_role_is_guessed_from_name_solvent_conditions_and_date(
    changes: dict[str, object], role: str
) -> None:
    guess = guess_role(metadata(**changes), metadata())
    assert guess.role == role
    assert guess.why.endswith((".", '".'))


def test_first_spectrum_is_main_and_heavy_water_is_no_shake_in_heavy_water() -> None:
    assert guess_role(metadata(), None).role == "main"
    wet = metadata(solvent="D2O")
    assert guess_role(replace(wet, title="d2o added"), wet).role == "reference"


def test_added_spectrum_waits_beside_the_shown_one() -> None:
    project = two_spectra()
    assert [one.role for one in spectra(project)] == ["main", "D2O shake"]
    assert project.role == "main"
    assert project.ledger is not None
    assert "as D2O shake" in project.audit[-1].what


def test_showing_the_other_and_back_changes_nothing() -> None:
    project = two_spectra()
    pin = PinClaim(claim="2-HB", shift_ppm=2.42, low_ppm=2.38, high_ppm=2.45)
    project = apply_edit(project, pin, when=WHEN)
    other = step_spectrum(project)
    assert other.source_name == "tube_d2o_shake"
    assert other.ledger is None
    assert other.edits == ()
    assert other.needs_ledger
    back = step_spectrum(other)
    assert back.ledger is project.ledger
    assert back.edits == (pin,)
    assert [one.key for one in spectra(back)] == [0, 1]


def test_same_data_twice_are_refused_in_a_sentence() -> None:
    with pytest.raises(ValueError, match="in the sample already"):
        add_spectrum(two_spectra(), fid(sha256="a" * 64), source_path="/z", when=WHEN)


def test_role_set_by_hand_keeps_one_main_spectrum() -> None:
    project = set_role(two_spectra(), 1, "main", when=WHEN)
    main = main_spectrum(project)
    assert main is not None
    assert main.key == 1
    assert spectrum_of(project, 0).role == "reference"
    assert set_role(project, 1, "main", when=WHEN) is project
    with pytest.raises(ValueError, match="role: must be one of"):
        set_role(project, 1, "witness", when=WHEN)  # type: ignore[arg-type]  # wrong on purpose


def test_own_conditions_make_only_that_spectrum_stale() -> None:
    project = two_spectra()
    changed = set_conditions(
        project, 1, solvent="DMSO-d6", temperature_k=320.0, when=WHEN
    )
    assert changed.ledger is project.ledger
    shown = show_spectrum(changed, 1)
    assert shown.options.solvent == "DMSO-d6"
    assert shown.options.temperature_k == 320.0
    assert show_spectrum(shown, 0).options.solvent is None


def test_removed_spectrum_hands_over_to_the_next() -> None:
    project = remove_spectrum(two_spectra(), 0, when=WHEN)
    assert [one.key for one in spectra(project)] == [1]
    assert project.source_name == "tube_d2o_shake"
    with pytest.raises(ValueError, match="only spectrum"):
        remove_spectrum(project, 1, when=WHEN)


def test_renaming_a_claim_reaches_spectra_that_are_not_shown() -> None:
    project = step_spectrum(two_spectra())
    ledger = overlapped_ledger()
    project = with_ledger(project, ledger, when=WHEN)
    project = apply_edit(project, RenameLabel(claim="4-H", label="Me"), when=WHEN)
    (other,) = project.others
    assert other.ledger is not None
    assert "Me" in {entry.claim for entry in other.ledger.entries}


def test_all_spectra_come_back_from_the_file(tmp_path: Path) -> None:
    project = step_spectrum(two_spectra())
    save_project(project, tmp_path / "tube.sledger")
    back = load_project(tmp_path / "tube.sledger")
    assert [(one.key, one.role, one.role_why) for one in spectra(back)] == [
        (one.key, one.role, one.role_why) for one in spectra(project)
    ]
    assert not step_spectrum(back).needs_ledger


def test_file_from_before_samples_had_spectra_still_loads() -> None:
    encoder = Encoder()
    tree = encoder.encode(two_spectra())
    for name in ("key", "role", "role_why", "others"):
        del tree[name]
    project = decode(tree, encoder.arrays)
    assert [one.role for one in spectra(project)] == ["main"]
