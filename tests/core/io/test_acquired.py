"""Real data as spectrometers wrote it, against their headers and their makers' spectra."""

import json
import re
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest

from shared_data import SHARED, shared
from spinledger.errors import SpectrumFormatError
from spinledger.io.read import list_experiments, read_acquired
from spinledger.values.acquisition import Acquired, Fid, MakerSpectrum

ACQUIRED = SHARED / "acquired"
NAMES = sorted(path.parent.name for path in ACQUIRED.glob("*/truth.json"))
PROTON = [name for name in NAMES if name != "neg_inosine_13C-in-1H-set"]
BRUKER = [name for name in PROTON if name.startswith("br")]
JCAMP = [name for name in PROTON if name.startswith("jc_")]
PROCESSED_ONLY = [name for name in PROTON if name.startswith("os_")]


def dataset(name: str) -> Path:
    """The data set of a compound: a maker's folder, a JEOL file, a FID, a spectrum."""
    raw = shared("acquired", name, "raw")
    for pattern in ("acqus", "procpar"):
        for hit in sorted(raw.rglob(pattern)):
            return hit.parent
    for pattern in ("*.jdf", "*fid.dx", "*.dx", "*.jdx"):
        for hit in sorted(raw.rglob(pattern)):
            return hit
    raise AssertionError(f"no data set under {raw}")


def makers_spectrum(name: str) -> MakerSpectrum:
    place = dataset(name)
    beside = place.parent / "1h.dx"
    acquired = read_acquired(
        beside if beside.exists() else place, prefer_processed=True
    )
    assert isinstance(acquired, MakerSpectrum)
    return acquired


def fid_of(name: str) -> Fid:
    acquired = read_acquired(dataset(name))
    assert isinstance(acquired, Fid)
    return acquired


def header_number(text: str, pattern: str) -> float:
    """A number found in the raw header by eye, so to speak: one regular expression."""
    match = re.search(pattern + r"\s*<?([-+.\deE]+)", text, re.MULTILINE)
    assert match is not None, pattern
    return float(match[1])


def test_there_are_data_to_read() -> None:
    shared("acquired")
    assert len(PROTON) == 59


@pytest.mark.parametrize("name", PROTON)
def test_field_and_nucleus_agree_with_the_published_facts(name: str) -> None:
    acquired = read_acquired(dataset(name))
    truth = json.loads((ACQUIRED / name / "truth.json").read_text())
    assert acquired.metadata.nucleus == "1H"
    # The tables give the field to 0.01 MHz, some of them rounded to whole MHz.
    digits = len(str(truth["field_mhz"]).partition(".")[2])
    assert acquired.metadata.spectrometer_frequency_mhz == pytest.approx(
        float(truth["field_mhz"]), abs=0.6 if digits == 0 else 0.011
    )


@pytest.mark.parametrize("name", BRUKER)
def test_bruker_numbers_are_those_of_the_header(name: str) -> None:
    fid = fid_of(name)
    text = (dataset(name) / "acqus").read_text(encoding="latin-1")
    assert fid.spectral_width_hz == header_number(text, r"^##\$SW_h=")
    assert fid.samples.size == header_number(text, r"^##\$TD=") // 2
    base_mhz = header_number(text, r"^##\$BF1=")
    offset_hz = header_number(text, r"^##\$O1=")
    assert fid.carrier_ppm == pytest.approx(offset_hz / base_mhz, rel=1e-12)
    assert fid.metadata.temperature_k == header_number(text, r"^##\$TE=")
    assert fid.metadata.n_scans == header_number(text, r"^##\$NS=")
    assert 50 < fid.group_delay_points < 80  # all of these are digitally filtered
    assert fid.metadata.notes == ()


@pytest.mark.parametrize("name", JCAMP)
def test_jcamp_fid_numbers_are_those_of_the_header(name: str) -> None:
    fid = fid_of(name)
    text = dataset(name).read_text(encoding="latin-1")
    # 1e-9: the width is also 1 over the dwell time, written with 12 digits.
    assert fid.spectral_width_hz == pytest.approx(
        header_number(text, r"^##\$SW_h="), rel=1e-9
    )
    assert fid.samples.size == header_number(text, r"^##VAR_DIM=")
    assert 50 < fid.group_delay_points < 80
    assert fid.metadata.notes == ()


@pytest.mark.parametrize("name", PROCESSED_ONLY)
def test_processed_jcamp_axis_is_that_of_the_header(name: str) -> None:
    spectrum = makers_spectrum(name).spectrum
    text = dataset(name).read_text(encoding="latin-1")
    observe_mhz = header_number(text, r"^##\.OBSERVE FREQUENCY=")
    # 1e-7 ppm: the header gives Hz to 1e-8, the last point by adding 16,383 steps.
    ends_hz = [header_number(text, rf"^##{end}X=") for end in ("FIRST", "LAST")]
    np.testing.assert_allclose(
        [spectrum.first_point_ppm, spectrum.last_point_ppm],
        np.array(ends_hz) / observe_mhz,
        atol=1e-7,
    )
    top = header_number(text, r"^##MAXY=")
    assert spectrum.intensities.max() == pytest.approx(top, rel=1e-6)


def test_wrong_nucleus_is_refused_in_one_sentence() -> None:
    place = dataset("neg_inosine_13C-in-1H-set")
    with pytest.raises(SpectrumFormatError) as caught:
        read_acquired(place)
    assert caught.value.reason == (
        "holds 13C data and only 1H can be reconciled; "
        "give the proton spectrum of this sample"
    )
    for above in (place.parent, place.parent.parent):
        with pytest.raises(SpectrumFormatError, match="holds 13C data"):
            read_acquired(above)


# ---- the sense of the frequencies, by the peaks of the makers' own spectra


def log_profile(
    shifts_ppm: npt.NDArray[np.float64],
    magnitudes: npt.NDArray[np.float64],
    grid_ppm: npt.NDArray[np.float64],
) -> npt.NDArray[np.float64]:
    """Log magnitude on a grid, the noise level added so that it stays finite."""
    order = np.argsort(shifts_ppm)
    values = np.interp(grid_ppm, shifts_ppm[order], magnitudes[order])
    return np.asarray(np.log(values + np.median(values)))


def best_correlation(
    profile: npt.NDArray[np.float64], longer: npt.NDArray[np.float64]
) -> float:
    """Highest Pearson correlation of a profile with a stretch of a longer one."""
    return max(
        float(np.corrcoef(profile, longer[start : start + profile.size])[0, 1])
        for start in range(longer.size - profile.size + 1)
    )


@pytest.mark.parametrize("name", BRUKER + JCAMP)
def test_peaks_of_the_fid_stand_where_the_maker_has_them(name: str) -> None:
    fid, maker = fid_of(name), makers_spectrum(name).spectrum
    # 3 Hz broadening: a grid of 3 Hz then meets every peak.
    times_s = np.arange(fid.samples.size) / fid.spectral_width_hz
    smooth = fid.samples * np.exp(-3 * np.pi * times_s)
    lines = np.abs(np.fft.fftshift(np.fft.fft(smooth, 2 * smooth.size)))
    offsets_hz = (np.arange(lines.size) / lines.size - 0.5) * fid.spectral_width_hz
    offsets_ppm = offsets_hz / fid.metadata.spectrometer_frequency_mhz
    assert fid.carrier_ppm is not None
    reach_ppm = 0.3  # raw and referenced axes differ by up to 0.22 ppm
    half_ppm = offsets_ppm[-1] - reach_ppm
    # 3 Hz or finer: no wider than the lines.
    step_ppm = 3.0 / fid.metadata.spectrometer_frequency_mhz
    grid_ppm = fid.carrier_ppm + np.arange(-half_ppm, half_ppm, step_ppm)
    extra = round(reach_ppm / step_ppm)
    longer_ppm = grid_ppm[0] + step_ppm * np.arange(-extra, grid_ppm.size + extra)
    imaginary = maker.imaginary
    if imaginary is None:
        imaginary = np.zeros(maker.n_points)
    target = log_profile(
        maker.shifts_ppm, np.hypot(maker.intensities, imaginary), longer_ppm
    )
    best = {
        sense: best_correlation(
            log_profile(fid.carrier_ppm + sense * offsets_ppm, lines, grid_ppm), target
        )
        for sense in (1, -1)
    }
    # Water at the carrier is the same either way, so the mirror scores up to 0.7.
    assert best[1] > 0.6
    assert best[1] > best[-1] + 0.15


def highest_within(fid: Fid, low_ppm: float, high_ppm: float, *, sense: int) -> float:
    """Largest magnitude in a window of the shift axis, of the FID's spectrum."""
    lines = np.abs(np.fft.fftshift(np.fft.fft(fid.samples)))
    offsets_hz = (np.arange(lines.size) / lines.size - 0.5) * fid.spectral_width_hz
    carrier_ppm = fid.carrier_ppm if fid.carrier_ppm is not None else 4.78
    shifts = carrier_ppm + sense * offsets_hz / fid.metadata.spectrometer_frequency_mhz
    return float(lines[(shifts > low_ppm) & (shifts < high_ppm)].max())


def assert_lines_at(fid: Fid, windows: tuple[tuple[float, float], ...]) -> None:
    for low_ppm, high_ppm in windows:
        here = highest_within(fid, low_ppm, high_ppm, sense=1)
        mirror = highest_within(fid, low_ppm, high_ppm, sense=-1)
        assert here > 3 * mirror, (low_ppm, high_ppm)


# 2-Oxobutanoate in water: CH3 t 1.05, CH2 q 2.75 (HMDB, record HMDB0000005).
KETOBUTYRATE_PPM = ((1.02, 1.12), (2.70, 2.82))


def test_varian_lines_stand_at_the_shifts_of_the_compound() -> None:
    place = dataset("va_2-ketobutyric-acid")
    fid = read_acquired(place)
    assert isinstance(fid, Fid)
    text = (place / "procpar").read_text()
    assert fid.spectral_width_hz == header_number(text, r"^sw 1 .*\n1")
    assert fid.samples.size == header_number(text, r"^np .*\n1") // 2
    assert fid.group_delay_points == 0.0
    assert (fid.metadata.n_scans, fid.metadata.acquired_on) == (128, "2013-05-13")
    assert_lines_at(fid, KETOBUTYRATE_PPM)


def test_jeol_lines_stand_at_the_shifts_of_the_compound() -> None:
    fid = read_acquired(dataset("jeol_resveratrol"))
    assert isinstance(fid, Fid)
    # Orders 41 and 73, factors 6 and 2: 20/12 + 36/2.
    assert fid.group_delay_points == pytest.approx(19.6667, abs=1e-4)
    assert (fid.samples.size, fid.carrier_ppm) == (44984, 5.0)
    assert fid.spectral_width_hz == pytest.approx(11261.2613, abs=1e-3)
    assert fid.metadata.solvent == "METHANOL-D4"
    assert fid.metadata.acquired_on == "2024-08-13"
    # trans-Resveratrol in CD3OD: H-4 6.16, H-2 6.44, H-2' 7.35 (common knowledge, to
    # 0.05 ppm); the axis is not referenced. H-3' mirrors onto the solvent's line.
    windows = ((6.08, 6.22), (6.38, 6.50), (7.28, 7.38))
    assert_lines_at(fid, windows)


# ---- twins and folders above


def test_nmrml_twin_holds_the_same_fid() -> None:
    raw = shared("acquired", "br_gaba_metabohub", "raw")
    (path,) = raw.glob("*.nmrML")
    twin, own = read_acquired(path), read_acquired(raw / "1H")
    assert isinstance(twin, Fid)
    assert isinstance(own, Fid)
    np.testing.assert_array_equal(twin.samples, own.samples)
    assert twin.spectral_width_hz == pytest.approx(own.spectral_width_hz, rel=1e-9)
    assert twin.carrier_ppm == pytest.approx(own.carrier_ppm, rel=1e-9)
    assert twin.group_delay_points == own.group_delay_points == 76.0
    # So the folder above holds one experiment, and the maker's form is taken.
    assert read_acquired(raw).metadata.format_name == "Bruker folder"


def test_nmrml_of_another_acquisition_is_not_a_twin() -> None:
    raw = shared("acquired", "va_2-ketobutyric-acid", "raw")
    (path,) = raw.glob("*.nmrML")
    fid = read_acquired(path)
    assert isinstance(fid, Fid)
    assert (fid.samples.size, fid.spectral_width_hz) == (28800, 7200.0)
    assert fid.carrier_ppm is None  # the file does not say
    assert_lines_at(fid, KETOBUTYRATE_PPM)
    with pytest.raises(SpectrumFormatError, match="holds 2 proton experiments"):
        read_acquired(raw)


def test_spectrum_of_the_nmrml_files() -> None:
    for name, first_ppm in (
        ("br_gaba_metabohub", 11.07747),
        ("va_2-ketobutyric-acid", 10.79161334),
    ):
        (path,) = shared("acquired", name, "raw").glob("*.nmrML")
        acquired = read_acquired(path, prefer_processed=True)
        assert isinstance(acquired, MakerSpectrum)
        assert acquired.spectrum.n_points == 32768
        # As written in the file: six decimals, or doubles.
        assert acquired.spectrum.first_point_ppm == pytest.approx(first_ppm, abs=1e-6)


@pytest.mark.parametrize("name", JCAMP)
def test_folder_with_fid_and_spectrum_is_one_experiment(name: str) -> None:
    raw = shared("acquired", name, "raw")
    assert isinstance(read_acquired(raw), Fid)
    assert isinstance(read_acquired(raw, prefer_processed=True), MakerSpectrum)
    assert len(list_experiments(raw)) == 2


@pytest.mark.parametrize(
    "name", ["br_l-alanine_bmse000028", "jeol_resveratrol", "os_r-carvone"]
)
def test_compound_folder_leads_to_its_data(name: str) -> None:
    above: Acquired = read_acquired(shared("acquired", name))
    own = read_acquired(dataset(name))
    assert above.metadata.sha256 == own.metadata.sha256


def test_whole_collection_is_listed_not_guessed() -> None:
    with pytest.raises(
        SpectrumFormatError, match=r"proton experiments: .* and \d+ more"
    ):
        read_acquired(shared("acquired"))


# ---- scale


@pytest.mark.parametrize("name", BRUKER[:6])
def test_processed_data_are_on_the_scale_of_the_header(name: str) -> None:
    spectrum = makers_spectrum(name).spectrum
    text = (dataset(name) / "pdata/1/procs").read_text(encoding="latin-1")
    exponent = header_number(text, r"^##\$NC_proc=")
    top = header_number(text, r"^##\$YMAX_p=")
    assert spectrum.intensities.max() == pytest.approx(top * 2.0**exponent, rel=1e-12)
