"""JCAMP-DX files as several exporters write them."""

from pathlib import Path

import numpy as np
import pytest

from instrument_files import (
    CARRIER_PPM,
    WIDTH_HZ,
    jcamp_fid_text,
    jcamp_spectrum_text,
    known_fid,
)
from spinledger.io.read import list_experiments, read_acquired
from spinledger.values.acquisition import Fid, MakerSpectrum

N_POINTS = 101
ORDINATES = [round(1e4 / (1 + (index - 40) ** 2)) for index in range(N_POINTS)]
TABLE = "\n".join(f"{3000 - 30 * i} {y}" for i, y in enumerate(ORDINATES))


def read_text(folder: Path, text: str) -> Fid | MakerSpectrum:
    path = folder / "data"
    path.write_text(text)
    return read_acquired(path)


def spectrum_of(folder: Path, text: str) -> MakerSpectrum:
    acquired = read_text(folder, text)
    assert isinstance(acquired, MakerSpectrum)
    return acquired


def fid_of(folder: Path, text: str) -> Fid:
    acquired = read_text(folder, text)
    assert isinstance(acquired, Fid)
    return acquired


def test_spectrum_axis_in_hz_is_referenced_to_0_ppm(tmp_path: Path) -> None:
    found = spectrum_of(tmp_path, jcamp_spectrum_text(TABLE)).spectrum
    assert found.intensities.tolist() == ORDINATES
    # 3000 Hz at 300 MHz is 10 ppm; 101 points lie 0.1 ppm apart.
    np.testing.assert_allclose(
        found.shifts_ppm, 10 - 0.1 * np.arange(N_POINTS), atol=1e-9
    )


def test_spectrum_axis_in_ppm(tmp_path: Path) -> None:
    text = jcamp_spectrum_text(TABLE, XUNITS="PPM", FIRSTX=9.0, LASTX=-1.0)
    found = spectrum_of(tmp_path, text).spectrum
    np.testing.assert_allclose(found.shifts_ppm[[0, -1]], [9.0, -1.0], atol=1e-9)


def test_ascending_axis_is_turned_highest_shift_first(tmp_path: Path) -> None:
    text = jcamp_spectrum_text(TABLE, XUNITS="PPM", FIRSTX=-1.0, LASTX=9.0)
    found = spectrum_of(tmp_path, text).spectrum
    assert found.intensities.tolist() == ORDINATES[::-1]
    np.testing.assert_allclose(found.shifts_ppm[[0, -1]], [9.0, -1.0], atol=1e-9)


def test_shift_reference_moves_an_unreferenced_hz_axis(tmp_path: Path) -> None:
    text = jcamp_spectrum_text(TABLE, **{".SHIFT REFERENCE": "INTERNAL, TMS, 91, 0.0"})
    found = spectrum_of(tmp_path, text).spectrum
    # Point 91, counted from 1, is 0 ppm; point 1 lies 90 steps of 0.1 ppm above.
    assert found.first_point_ppm == pytest.approx(9.0, abs=1e-9)


def test_offset_label_gives_the_first_point(tmp_path: Path) -> None:
    labels = {"$OFFSET": 8.5, "$SF": 300.0, ".SHIFT REFERENCE": None}
    found = spectrum_of(tmp_path, jcamp_spectrum_text(TABLE, **labels)).spectrum
    assert found.first_point_ppm == pytest.approx(8.5, abs=1e-12)


def test_missing_reference_is_noted(tmp_path: Path) -> None:
    text = jcamp_spectrum_text(TABLE, **{".SHIFT REFERENCE": None})
    assert any("0 Hz" in note for note in spectrum_of(tmp_path, text).metadata.notes)


def test_decimal_commas_in_header_and_table(tmp_path: Path) -> None:
    table = "\n".join(f"{3000 - 30 * i},0 {y},5" for i, y in enumerate(ORDINATES))
    text = jcamp_spectrum_text(
        table,
        **{".OBSERVE FREQUENCY": "60,0", "FIRSTX": "600,0", "LASTX": "0,0"},
    )
    found = spectrum_of(tmp_path, text)
    assert found.metadata.spectrometer_frequency_mhz == 60.0
    assert found.spectrum.first_point_ppm == pytest.approx(10.0)
    np.testing.assert_allclose(found.spectrum.intensities, np.array(ORDINATES) + 0.5)


def test_factor_scales_the_ordinates(tmp_path: Path) -> None:
    found = spectrum_of(tmp_path, jcamp_spectrum_text(TABLE, YFACTOR=0.25)).spectrum
    np.testing.assert_allclose(found.intensities, 0.25 * np.array(ORDINATES))


def test_points_table_is_read_where_it_is_even(tmp_path: Path) -> None:
    pairs = "\n".join(f"{3000 - 30 * i}, {y}" for i, y in enumerate(ORDINATES))
    text = jcamp_spectrum_text(pairs).replace(
        "##XYDATA= (X++(Y..Y))", "##XYPOINTS= (XY..XY)"
    )
    found = spectrum_of(tmp_path, text).spectrum
    assert found.intensities.tolist() == ORDINATES
    assert found.first_point_ppm == pytest.approx(10.0)


def test_peak_list_is_refused(tmp_path: Path) -> None:
    text = jcamp_spectrum_text("7.2, 10\n2.1, 30", **{"DATA TYPE": "NMR PEAK TABLE"})
    with pytest.raises(ValueError, match="holds nmr peak table but no NMR spectrum"):
        read_text(tmp_path, text)


def test_infrared_spectrum_is_refused(tmp_path: Path) -> None:
    text = jcamp_spectrum_text(TABLE, **{"DATA TYPE": "INFRARED SPECTRUM"})
    with pytest.raises(ValueError, match="holds infrared spectrum but no NMR"):
        read_text(tmp_path, text)


def test_two_dimensional_data_are_refused(tmp_path: Path) -> None:
    text = jcamp_spectrum_text(TABLE, **{"DATA TYPE": "nD NMR SPECTRUM"})
    with pytest.raises(ValueError, match="holds 2D or arrayed data"):
        read_text(tmp_path, text)


def test_several_pages_of_one_kind_are_refused(tmp_path: Path) -> None:
    text = jcamp_fid_text()
    page = text[text.index("##PAGE= N=1") : text.index("##PAGE= N=2")]
    with pytest.raises(ValueError, match="array of traces"):
        read_text(tmp_path, text.replace("##END NTUPLES=", page + "##END NTUPLES="))


def test_fid_without_imaginary_part_is_refused(tmp_path: Path) -> None:
    text = jcamp_fid_text()
    start, stop = text.index("##PAGE= N=2"), text.index("##END NTUPLES=")
    with pytest.raises(ValueError, match="only the real part of its FID"):
        read_text(tmp_path, text[:start] + text[stop:])


def test_missing_carrier_stays_unknown(tmp_path: Path) -> None:
    fid = fid_of(tmp_path, jcamp_fid_text(**{"$O1": None}))
    assert fid.carrier_ppm is None


def test_carrier_from_two_frequencies(tmp_path: Path) -> None:
    labels = {"$O1": None, "$SFO1": 400.13 * (1 + CARRIER_PPM * 1e-6)}
    # 1e-6 ppm: the difference of two frequencies of 12 digits.
    assert fid_of(tmp_path, jcamp_fid_text(**labels)).carrier_ppm == pytest.approx(
        CARRIER_PPM, abs=1e-6
    )


@pytest.mark.parametrize(
    ("labels", "delay_points"),
    [
        # DECIM 32 with DSPFVS 12: 72.125 in the published table of delays.
        ({"$DECIM": 32, "$DSPFVS": 12, "$GRPDLY": -1}, 72.125),
        ({"$DECIM": 24, "$DSPFVS": 10}, 61.020833333333333),
        ({"$DECIM": 4106.7, "$DSPFVS": 20, "$GRPDLY": 67.98555}, 67.98555),
        ({"$DECIM": 1, "$DSPFVS": 10, "$GRPDLY": -1}, 0.0),
        ({}, 0.0),
        ({"$DECIM": 32, "$DSPFVS": 12, "$DIGMOD": 0}, 0.0),
    ],
)
def test_filter_delay_from_the_exported_labels(
    labels: dict[str, object], delay_points: float, tmp_path: Path
) -> None:
    fid = fid_of(tmp_path, jcamp_fid_text(**labels))
    assert fid.group_delay_points == pytest.approx(delay_points, rel=1e-12)


def test_width_comes_from_the_time_axis_and_a_contradiction_is_noted(
    tmp_path: Path,
) -> None:
    agreeing = fid_of(tmp_path, jcamp_fid_text(**{"$SW_h": WIDTH_HZ * 1.0001}))
    assert agreeing.spectral_width_hz == pytest.approx(WIDTH_HZ * 1.0001, rel=1e-12)
    contradicting = fid_of(tmp_path, jcamp_fid_text(**{"$SW_h": 8000}))
    assert contradicting.spectral_width_hz == pytest.approx(WIDTH_HZ, rel=1e-9)
    assert any("8000 Hz" in note for note in contradicting.metadata.notes)


def linked(fid_text: str, spectrum_text: str) -> str:
    return (
        "##TITLE= both\n##JCAMP-DX= 5.01\n##DATA TYPE= LINK\n##BLOCKS= 2\n"
        f"{fid_text}{spectrum_text}##END=\n"
    )


def spectrum_beside(fid: np.ndarray) -> str:
    """The maker's spectrum of a FID, in the right sense, as a JCAMP block."""
    lines = np.abs(np.fft.fftshift(np.fft.fft(fid)))[::-1]
    table = "\n".join(f"{i} {y:.0f}" for i, y in enumerate(lines))
    width_ppm = WIDTH_HZ / 400.13
    return jcamp_spectrum_text(
        table,
        XUNITS="PPM",
        FIRSTX=CARRIER_PPM + width_ppm / 2,
        LASTX=CARRIER_PPM - width_ppm / 2,
        NPOINTS=lines.size,
        **{".OBSERVE FREQUENCY": 400.13},
    )


def test_fid_wins_over_the_spectrum_of_one_file(tmp_path: Path) -> None:
    path = tmp_path / "both.jdx"
    path.write_text(linked(jcamp_fid_text(), spectrum_beside(known_fid())))
    assert isinstance(read_acquired(path), Fid)
    assert isinstance(read_acquired(path, prefer_processed=True), MakerSpectrum)
    (listed,) = list_experiments(path)
    assert (listed.has_fid, listed.has_spectrum) == (True, True)


def test_opposite_sense_is_told_by_the_spectrum_of_the_same_file(
    tmp_path: Path,
) -> None:
    wrong_way = jcamp_fid_text(np.conj(known_fid()))
    fid = fid_of(tmp_path, linked(wrong_way, spectrum_beside(known_fid())))
    np.testing.assert_array_equal(fid.samples, known_fid())
    assert any("conjugated" in note for note in fid.metadata.notes)


def test_count_that_differs_from_the_header_is_noted_or_refused(tmp_path: Path) -> None:
    found = spectrum_of(tmp_path, jcamp_spectrum_text(TABLE, NPOINTS=150))
    assert any("declares 150 points" in note for note in found.metadata.notes)
    with pytest.raises(ValueError, match="holds only 101 of the 300 points"):
        read_text(tmp_path, jcamp_spectrum_text(TABLE, NPOINTS=300))
    with pytest.raises(ValueError, match="declares 99999999999 data points"):
        read_text(tmp_path, jcamp_spectrum_text(TABLE, NPOINTS=99999999999))


def test_failed_checks_are_noted(tmp_path: Path) -> None:
    rows = [f"{i} {y}" for i, y in enumerate(ORDINATES[:-3])]
    packed = "\n".join(["0A0%%%%%", "5B0" + "J" * 80, "90" + "A00" + "J" * 20])
    del rows
    text = jcamp_spectrum_text(packed, NPOINTS=106)
    notes = spectrum_of(tmp_path, text).metadata.notes
    assert any("2 check values" in note for note in notes)


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "cp1252", "utf-16"])
def test_titles_in_any_common_encoding(encoding: str, tmp_path: Path) -> None:
    path = tmp_path / "data"
    text = jcamp_spectrum_text(TABLE, TITLE="Säure, 25 °C")
    path.write_bytes(text.encode(encoding))
    assert read_acquired(path).metadata.title == "Säure, 25 °C"


def test_any_line_ends(tmp_path: Path) -> None:
    path = tmp_path / "data"
    for ending in (b"\r\n", b"\r"):
        path.write_bytes(jcamp_spectrum_text(TABLE).encode().replace(b"\n", ending))
        acquired = read_acquired(path)
        assert isinstance(acquired, MakerSpectrum)
        assert acquired.spectrum.intensities.tolist() == ORDINATES


@pytest.mark.parametrize(
    ("labels", "reason"),
    [
        ({".OBSERVE FREQUENCY": None}, "does not state the spectrometer frequency"),
        ({".OBSERVE FREQUENCY": 3e6}, "which no spectrometer has"),
        ({"FIRSTX": None}, "does not state its axis"),
        ({"XUNITS": "SECONDS"}, "time axis but calls itself a spectrum"),
        ({"YFACTOR": "1e305"}, "not finite numbers"),
        ({"YFACTOR": "0"}, "without any signal"),
    ],
)
def test_missing_or_absurd_labels_say_what_is_wrong(
    labels: dict[str, object], reason: str, tmp_path: Path
) -> None:
    with pytest.raises(ValueError, match=reason):
        read_text(tmp_path, jcamp_spectrum_text(TABLE, **labels))


def test_unknown_exporter_is_told_of(tmp_path: Path) -> None:
    fid = fid_of(tmp_path, jcamp_fid_text(**{"$AQ_mod": None}))
    assert any("sense of its frequencies" in note for note in fid.metadata.notes)


def test_spectrum_settles_the_sense_of_an_unknown_exporter(tmp_path: Path) -> None:
    text = jcamp_fid_text(**{"$AQ_mod": None})
    fid = fid_of(tmp_path, linked(text, spectrum_beside(known_fid())))
    assert fid.metadata.notes == ()


def test_proton_block_is_taken_from_a_file_with_other_nuclei(tmp_path: Path) -> None:
    carbon = jcamp_spectrum_text(TABLE, **{".OBSERVE NUCLEUS": "^13C"})
    text = linked(carbon, jcamp_spectrum_text(TABLE, TITLE="proton"))
    assert spectrum_of(tmp_path, text).metadata.title == "proton"
    with pytest.raises(ValueError, match="holds several spectra"):
        read_text(tmp_path, linked(*[jcamp_spectrum_text(TABLE)] * 2))


@pytest.mark.parametrize(("written", "kelvin"), [("25", 298.15), ("298", 298.0)])
def test_temperature_in_either_unit(
    written: str, kelvin: float, tmp_path: Path
) -> None:
    found = spectrum_of(tmp_path, jcamp_spectrum_text(TABLE, TEMPERATURE=written))
    assert found.metadata.temperature_k == pytest.approx(kelvin)
