"""Every maker's layout of one known FID gives that FID back."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from instrument_files import (
    CARRIER_PPM,
    FREQUENCY_MHZ,
    LINES_HZ,
    WIDTH_HZ,
    jcamp_fid_text,
    known_fid,
    write_bruker,
    write_jeol,
    write_nmrml,
    write_spinsolve,
    write_varian,
)
from spinledger.io.read import list_experiments, read_acquired
from spinledger.values.acquisition import Fid


def write_jcamp(path: Path) -> Path:
    path.write_text(jcamp_fid_text())
    return path


WRITERS: dict[str, Callable[[Path], Path]] = {
    "Bruker folder": write_bruker,
    "Varian/Agilent folder": write_varian,
    "JEOL file": write_jeol,
    "JCAMP-DX FID": write_jcamp,
    "nmrML FID": write_nmrml,
    "Spinsolve folder": write_spinsolve,
}


def read_fid(path: Path) -> Fid:
    acquired = read_acquired(path)
    assert isinstance(acquired, Fid)
    return acquired


@pytest.mark.parametrize("format_name", WRITERS)
def test_every_format_gives_the_samples_as_they_were(
    format_name: str, tmp_path: Path
) -> None:
    # The name tells nothing: formats are found by content.
    fid = read_fid(WRITERS[format_name](tmp_path / "data.bin"))
    assert fid.metadata.format_name == format_name
    # Whole numbers below 2**24 pass every layout exactly.
    np.testing.assert_array_equal(fid.samples, known_fid())


@pytest.mark.parametrize("format_name", WRITERS)
def test_every_format_gives_width_field_and_carrier(
    format_name: str, tmp_path: Path
) -> None:
    fid = read_fid(WRITERS[format_name](tmp_path / "data"))
    # 1e-9: the numbers pass through text of at least ten digits.
    assert fid.spectral_width_hz == pytest.approx(WIDTH_HZ, rel=1e-9)
    assert fid.carrier_ppm == pytest.approx(CARRIER_PPM, rel=1e-9)
    assert fid.metadata.spectrometer_frequency_mhz == pytest.approx(FREQUENCY_MHZ)
    assert fid.metadata.nucleus == "1H"
    expected_delay = 20 / 12 + 36 / 2 if format_name == "JEOL file" else 0.0
    assert fid.group_delay_points == pytest.approx(expected_delay, rel=1e-12)


@pytest.mark.parametrize("format_name", WRITERS)
def test_lines_stand_at_their_shift_after_a_forward_transform(
    format_name: str, tmp_path: Path
) -> None:
    fid = read_fid(WRITERS[format_name](tmp_path / "data"))
    lines = np.abs(np.fft.fft(fid.samples))
    offsets_hz = np.fft.fftfreq(fid.samples.size, 1 / fid.spectral_width_hz)
    strongest_hz = float(offsets_hz[np.argmax(lines)])
    # The stronger line was written last; half a point is 2.5 Hz.
    assert strongest_hz == pytest.approx(LINES_HZ[-1], abs=2.5)


@pytest.mark.parametrize("format_name", WRITERS)
def test_experiment_is_listed_with_its_facts(format_name: str, tmp_path: Path) -> None:
    place = WRITERS[format_name](tmp_path / "data")
    (listed,) = list_experiments(tmp_path)
    assert (listed.path, listed.format_name) == (place, format_name)
    assert (listed.n_dimensions, listed.nucleus) == (1, "1H")
    assert "400 MHz" in listed.summary


FACTS = {
    "Bruker folder": ("CDCl3", 16, "zg30", 1.5, "2023-11-14", 298.15),
    "Varian/Agilent folder": ("cdcl3", 16, "s2pul", 1.5, "2023-11-14", 298.15),
    "JEOL file": ("CHLOROFORM-D", 16, "proton.jxp", None, "2023-11-14", None),
    "JCAMP-DX FID": ("CDCl3", None, None, None, None, None),
    "nmrML FID": (None, 16, "zg30", 1.5, None, 298.15),
    "Spinsolve folder": ("CDCl3", 16, "1D PROTON", 1.5, "2023-11-14", None),
}


@pytest.mark.parametrize("format_name", WRITERS)
def test_facts_come_in_one_spelling_and_unknown_ones_are_none(
    format_name: str, tmp_path: Path
) -> None:
    facts = read_fid(WRITERS[format_name](tmp_path / "data")).metadata
    assert (
        facts.solvent,
        facts.n_scans,
        facts.pulse_program,
        facts.relaxation_delay_s,
        facts.acquired_on,
        facts.temperature_k,
    ) == FACTS[format_name]
    assert facts.source_name == "data"
    assert facts.notes == ()


def test_pulse_is_the_one_applied_with_its_angle(tmp_path: Path) -> None:
    bruker = read_fid(write_bruker(tmp_path / "b")).metadata
    # zg30 gives a third of the 12 us 90 degree pulse.
    assert (bruker.pulse_length_us, bruker.pulse_angle_deg) == (4.0, 30.0)
    varian = read_fid(write_varian(tmp_path / "v")).metadata
    assert (varian.pulse_length_us, varian.pulse_angle_deg) == (4.0, 30.0)


WRONG_NUCLEUS: dict[str, Callable[[Path], object]] = {
    "Bruker folder": lambda path: write_bruker(path, NUC1="<13C>"),
    "Varian/Agilent folder": lambda path: write_varian(path, tn="C13"),
    "JEOL file": lambda path: write_jeol(path, x_domain="Carbon13"),
    "JCAMP-DX FID": lambda path: path.write_text(
        jcamp_fid_text(**{".OBSERVE NUCLEUS": "^13C"})
    ),
    "nmrML FID": lambda path: write_nmrml(path, nucleus="carbon-13"),
    "Spinsolve folder": lambda path: write_spinsolve(path, rxChannel='"13C"'),
}


@pytest.mark.parametrize("format_name", WRONG_NUCLEUS)
def test_wrong_nucleus_is_refused_by_name(format_name: str, tmp_path: Path) -> None:
    WRONG_NUCLEUS[format_name](tmp_path / "data")
    with pytest.raises(ValueError, match=r"holds 13C data and only 1H"):
        read_acquired(tmp_path / "data")
    # The same from the folder above, where it is the only experiment.
    with pytest.raises(ValueError, match=r"holds 13C data and only 1H"):
        read_acquired(tmp_path)
