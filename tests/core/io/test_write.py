"""Written spectra read back, here and by another reader; no half-written files."""

import csv
from pathlib import Path

import numpy as np
import pytest
from nmrglue.fileio import jcampdx as nmrglue_jcampdx

from spinledger.errors import OutputError
from spinledger.io.read import read_acquired
from spinledger.io.write import write_csv, write_jcamp
from spinledger.values.acquisition import MakerSpectrum, Metadata
from spinledger.values.spectrum import Spectrum

FACTS = Metadata(
    source_name="10",
    sha256="0" * 64,
    format_name="Bruker folder",
    nucleus="1H",
    spectrometer_frequency_mhz=400.13,
    solvent="CDCl3",
    temperature_k=298.15,
    n_scans=16,
    pulse_program="zg30",
    acquired_on="2023-11-14",
    title="ester $$ 7\nsecond line",
)


@pytest.fixture
def spectrum() -> Spectrum:
    rng = np.random.default_rng(3)
    axis = np.arange(4096)
    values = 1e7 / (1 + ((axis - 1000) / 2.5) ** 2) + rng.normal(0, 50.0, axis.size)
    return Spectrum(
        intensities=values - 200.0,
        first_point_ppm=12.3456789,
        spectral_width_hz=5001.7,
        spectrometer_frequency_mhz=400.13,
    )


def read_back(path: Path) -> MakerSpectrum:
    acquired = read_acquired(path)
    assert isinstance(acquired, MakerSpectrum)
    return acquired


def test_jcamp_reads_back_to_the_digits_written(
    spectrum: Spectrum, tmp_path: Path
) -> None:
    write_jcamp(spectrum, FACTS, tmp_path / "x.dx")
    found = read_back(tmp_path / "x.dx")
    # Half a unit of the whole numbers up to 2**30, as the docstring promises.
    largest = float(np.max(np.abs(spectrum.intensities)))
    np.testing.assert_allclose(
        found.spectrum.intensities, spectrum.intensities, rtol=0, atol=5e-10 * largest
    )
    # 12 digits of about 5000 Hz at 400 MHz: 1e-8 Hz, 2.5e-11 ppm.
    np.testing.assert_allclose(
        found.spectrum.shifts_ppm, spectrum.shifts_ppm, rtol=0, atol=1e-10
    )
    assert found.spectrum.spectral_width_hz == pytest.approx(5001.7, rel=1e-11)


def test_jcamp_written_twice_is_the_same_to_the_bit(
    spectrum: Spectrum, tmp_path: Path
) -> None:
    write_jcamp(spectrum, FACTS, tmp_path / "a.dx")
    first = read_back(tmp_path / "a.dx").spectrum
    write_jcamp(first, FACTS, tmp_path / "b.dx")
    second = read_back(tmp_path / "b.dx").spectrum
    np.testing.assert_array_equal(second.intensities, first.intensities)


def test_jcamp_keeps_the_facts(spectrum: Spectrum, tmp_path: Path) -> None:
    write_jcamp(spectrum, FACTS, tmp_path / "x.dx")
    facts = read_back(tmp_path / "x.dx").metadata
    assert (facts.solvent, facts.n_scans, facts.pulse_program) == ("CDCl3", 16, "zg30")
    assert (facts.nucleus, facts.acquired_on) == ("1H", "2023-11-14")
    assert facts.temperature_k == pytest.approx(298.15)
    assert facts.title == "ester $ 7 second line"
    assert facts.notes == ()


def test_jcamp_is_read_alike_by_another_reader(
    spectrum: Spectrum, tmp_path: Path
) -> None:
    write_jcamp(spectrum, FACTS, tmp_path / "x.dx")
    header, values = nmrglue_jcampdx.read(str(tmp_path / "x.dx"))
    largest = float(np.max(np.abs(spectrum.intensities)))
    np.testing.assert_allclose(
        values, spectrum.intensities, rtol=0, atol=5e-10 * largest
    )
    assert header["DATATYPE"] == ["NMR SPECTRUM"]
    assert header["NPOINTS"] == ["4096"]
    assert header["JCAMPDX"] == ["6.00"]
    assert float(header["FIRSTX"][0]) == pytest.approx(12.3456789 * 400.13, rel=1e-11)


def test_jcamp_lines_keep_to_80_characters(spectrum: Spectrum, tmp_path: Path) -> None:
    write_jcamp(spectrum, FACTS, tmp_path / "x.dx")
    lines = (tmp_path / "x.dx").read_text().split("\n")
    assert max(len(line) for line in lines) <= 80


def test_csv_has_shift_and_intensity(spectrum: Spectrum, tmp_path: Path) -> None:
    write_csv(spectrum, tmp_path / "x.csv")
    with (tmp_path / "x.csv").open(newline="") as stream:
        header, *rows = csv.reader(stream)
    assert header == ["ppm", "intensity"]
    shifts, values = np.array(rows, dtype=float).T
    np.testing.assert_array_equal(values, spectrum.intensities)
    # Nine decimals are written.
    np.testing.assert_allclose(shifts, spectrum.shifts_ppm, rtol=0, atol=5.1e-10)


def test_existing_file_is_replaced_whole(spectrum: Spectrum, tmp_path: Path) -> None:
    target = tmp_path / "x.csv"
    target.write_text("old")
    write_csv(spectrum, target)
    assert target.read_text().startswith("ppm,intensity\n")
    assert [path.name for path in tmp_path.iterdir()] == ["x.csv"]


def test_unwritable_places_say_so_and_leave_nothing(
    spectrum: Spectrum, tmp_path: Path
) -> None:
    with pytest.raises(OutputError, match="cannot be written"):
        write_csv(spectrum, tmp_path / "nowhere" / "x.csv")
    (tmp_path / "folder").mkdir()
    with pytest.raises(OutputError, match="cannot be written"):
        write_jcamp(spectrum, FACTS, tmp_path / "folder")
    assert [path.name for path in tmp_path.rglob("*")] == ["folder"]


def test_values_that_are_no_numbers_are_not_written(tmp_path: Path) -> None:
    values = np.ones(100)
    values[3] = np.nan
    broken = Spectrum(
        intensities=values,
        first_point_ppm=10.0,
        spectral_width_hz=5000.0,
        spectrometer_frequency_mhz=400.0,
    )
    with pytest.raises(OutputError, match="not finite"):
        write_jcamp(broken, FACTS, tmp_path / "x.dx")
    assert not list(tmp_path.iterdir())
