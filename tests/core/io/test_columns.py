"""Plain text in columns, as people export and edit it."""

from pathlib import Path

import numpy as np
import pytest

from spinledger.io.read import read_acquired
from spinledger.values.acquisition import MakerSpectrum

SHIFTS_PPM = 10.0 - 0.05 * np.arange(200)
VALUES = np.round(1000 / (1 + ((SHIFTS_PPM - 4.0) / 0.1) ** 2), 2)


def rows(form: str) -> str:
    return "\n".join(
        form.format(x=x, y=y) for x, y in zip(SHIFTS_PPM, VALUES, strict=True)
    )


def commas(form: str) -> str:
    return rows(form).replace(".", ",")


def read_text(folder: Path, text: str) -> MakerSpectrum:
    path = folder / "data.xyz"
    path.write_text(text)
    acquired = read_acquired(path)
    assert isinstance(acquired, MakerSpectrum)
    return acquired


FORMS = {
    "csv": "ppm,intensity\n" + rows("{x:.4f},{y:.2f}"),
    "tabs": rows("{x:.4f}\t{y:.2f}"),
    "spaces": rows("  {x:9.4f}   {y:.2f}"),
    "semicolons": "ppm;a.u.\n" + rows("{x:.4f};{y:.2f};"),
    "exponents": rows("{x:.6e} {y:.6e}"),
    "decimal commas, tabs": commas("{x:.4f}\t{y:.2f}"),
    "decimal commas, semicolons": commas("{x:.4f};{y:.2f}"),
    "decimal commas, spaces": commas("{x:.4f} {y:.2f}"),
    "three columns": rows("{x:.4f} {y:.2f} 0.0"),
}


@pytest.mark.parametrize("form", FORMS)
def test_every_common_form_gives_the_same_spectrum(form: str, tmp_path: Path) -> None:
    found = read_text(tmp_path, f"# 400.13 MHz\n{FORMS[form]}\n").spectrum
    np.testing.assert_allclose(found.shifts_ppm, SHIFTS_PPM, atol=1e-9)
    np.testing.assert_allclose(found.intensities, VALUES, rtol=1e-6)
    assert found.spectrometer_frequency_mhz == 400.13


def test_ascending_shifts_are_turned_round(tmp_path: Path) -> None:
    lines = FORMS["tabs"].split("\n")[::-1]
    found = read_text(tmp_path, "# 400.13 MHz\n" + "\n".join(lines)).spectrum
    np.testing.assert_allclose(found.intensities, VALUES)


def test_axis_in_hz_is_turned_into_ppm_with_a_note(tmp_path: Path) -> None:
    text = "\n".join(
        f"{400 * x:.3f}\t{y:.2f}" for x, y in zip(SHIFTS_PPM, VALUES, strict=True)
    )
    found = read_text(tmp_path, "# Hz, 400 MHz\n" + text)
    assert found.spectrum.first_point_ppm == pytest.approx(10.0)
    assert any("Hz" in note for note in found.metadata.notes)


@pytest.mark.parametrize(
    "remark",
    [
        "# 400.13 MHz",
        "Frequency (MHz) = 400.13",
        "##SFO1= 400.13",
        "Spektrum 400,13 MHz",
    ],
)
def test_frequency_is_found_in_any_remark(remark: str, tmp_path: Path) -> None:
    found = read_text(tmp_path, f"{remark}\n{FORMS['tabs']}\n")
    assert found.spectrum.spectrometer_frequency_mhz == 400.13


def test_solvent_and_nucleus_are_found_in_remarks(tmp_path: Path) -> None:
    text = f"# 400.13 MHz\n# solvent: DMSO-d6\n# nucleus = 1H\n{FORMS['tabs']}\n"
    facts = read_text(tmp_path, text).metadata
    assert (facts.solvent, facts.nucleus, facts.notes) == ("DMSO-d6", "1H", ())


def test_text_without_a_frequency_asks_for_it(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match=r'add a first line such as "# 400.13 MHz"'):
        read_text(tmp_path, FORMS["csv"])


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        (
            "\n".join(f"{x} {x}" for x in (9, 7, 6.5, 4, 3, 2, 1.5, 1) * 10),
            "not evenly",
        ),
        ("\n".join(f"{x} 1" for x in range(20)), "holds 20 rows of numbers"),
        (FORMS["tabs"] + "\n1 2 3\n", "rows of different length"),
        (rows("{x:.4f}\t7"), "without any signal"),
    ],
)
def test_other_tables_are_refused(text: str, reason: str, tmp_path: Path) -> None:
    with pytest.raises(ValueError, match=reason):
        read_text(tmp_path, f"# 400.13 MHz\n{text}\n")


def test_text_counts_in_a_folder_only_where_nothing_else_is(tmp_path: Path) -> None:
    (tmp_path / "table.txt").write_text(f"# 400.13 MHz\n{FORMS['tabs']}\n")
    assert read_acquired(tmp_path).metadata.source_name == "table.txt"
