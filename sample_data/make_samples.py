"""Write the sample data: an invented scenario, simulated by the project itself.

A small contract laboratory makes a beta-hydroxy ester. Four tubes came in; what
they hold, and what their labels claim, stands in the README beside this script.
Lines come from the exact spin simulation; width, shim tail, delay, noise, drift,
solvent, water, reference and impurity lines are put on here, with fixed seeds.

Run ``python sample_data/make_samples.py`` in the project's environment; it
rewrites the data folders, the structures and the table in README.md.
Frequencies in Hz, shifts in ppm, times in s.
"""

from __future__ import annotations

import hashlib
import shutil
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt
from rdkit import Chem
from rdkit.Chem import AllChem

from spinledger.spins.engine import simulate
from spinledger.values.spin_system import SpinSystem

HERE = Path(__file__).resolve().parent
N_POINTS = 16384
FIELD_MHZ = 400.13
WIDTH_HZ = 6410.2564
CARRIER_PPM = 5.0
GROUP_DELAY_POINTS = 67.98582
PEAK_COUNTS = 2.0e7


@dataclass(frozen=True, slots=True, kw_only=True)
class Group:
    """Protons of one shift: count, shift and width; ``label`` for the couplings."""

    label: str
    n_spins: int
    shift_ppm: float
    width_hz: float = 0.9


@dataclass(frozen=True, slots=True, kw_only=True)
class Singlet:
    """A line that takes no part in the spin system: area in protons."""

    shift_ppm: float
    protons: float
    width_hz: float = 0.9


@dataclass(frozen=True, slots=True, kw_only=True)
class Companion:
    """A second compound in the tube: its spins, and molecules per molecule of the first."""

    share: float
    groups: tuple[Group, ...]
    couplings_hz: dict[tuple[str, str], float]


@dataclass(frozen=True, slots=True, kw_only=True)
class Sample:
    """One tube: what is really in it, and how it was measured."""

    name: str
    solvent: str
    title: str
    date_s: int
    groups: tuple[Group, ...]
    couplings_hz: dict[tuple[str, str], float]
    singlets: tuple[Singlet, ...]
    noise: float
    seed: int
    axis_error_ppm: float
    phase_deg: float
    form: str
    pulse_program: str = "zg30"
    companions: tuple[Companion, ...] = ()


HYDROXY_ESTER = (
    Group(label="3", n_spins=1, shift_ppm=4.1903),
    Group(label="1'A", n_spins=1, shift_ppm=4.1712),
    Group(label="1'B", n_spins=1, shift_ppm=4.1655),
    Group(label="2A", n_spins=1, shift_ppm=2.4910),
    Group(label="2B", n_spins=1, shift_ppm=2.4190),
    Group(label="2'", n_spins=3, shift_ppm=1.2720),
    Group(label="4", n_spins=3, shift_ppm=1.2230),
)
HYDROXY_ESTER_J = {
    ("3", "4"): 6.31,
    ("3", "2A"): 3.41,
    ("3", "2B"): 8.60,
    ("2A", "2B"): -16.50,
    ("1'A", "2'"): 7.13,
    ("1'B", "2'"): 7.13,
    ("1'A", "1'B"): -10.80,
}


def methyl_ester(
    *, c3: float, c2: float, methyl: float, c4: float
) -> tuple[Group, ...]:
    """Carbon-bound protons of ethyl 3-hydroxy-2-methylbutanoate."""
    return (
        Group(label="3", n_spins=1, shift_ppm=c3),
        Group(label="1'", n_spins=2, shift_ppm=4.1720),
        Group(label="2", n_spins=1, shift_ppm=c2),
        Group(label="2'", n_spins=3, shift_ppm=1.2750),
        Group(label="2-Me", n_spins=3, shift_ppm=methyl),
        Group(label="4", n_spins=3, shift_ppm=c4),
    )


def methyl_ester_j(j_23_hz: float) -> dict[tuple[str, str], float]:
    """Couplings of one diastereomer; J(2,3) tells them apart."""
    return {
        ("2", "3"): j_23_hz,
        ("3", "4"): 6.35,
        ("2", "2-Me"): 7.20,
        ("1'", "2'"): 7.13,
    }


CHLOROFORM = Singlet(shift_ppm=7.260, protons=0.42)
TMS = Singlet(shift_ppm=0.0, protons=0.9)
SAMPLES = (
    Sample(
        name="batch-117",
        solvent="CDCl3",
        title="Batch 117, hydroxy ester, as received",
        date_s=1793000000,
        groups=(
            *HYDROXY_ESTER,
            Group(label="OH", n_spins=1, shift_ppm=2.960, width_hz=14.0),
        ),
        couplings_hz=HYDROXY_ESTER_J,
        singlets=(
            CHLOROFORM,
            TMS,
            Singlet(shift_ppm=1.560, protons=0.35, width_hz=2.5),
            Singlet(shift_ppm=2.170, protons=0.09),
        ),
        noise=4.0e-4,
        seed=117,
        axis_error_ppm=0.031,
        phase_deg=37.0,
        form="bruker",
    ),
    Sample(
        name="batch-117-shaken",
        solvent="CDCl3",
        title="Batch 117 after a shake with heavy water",
        date_s=1793003600,
        groups=HYDROXY_ESTER,
        couplings_hz=HYDROXY_ESTER_J,
        singlets=(
            CHLOROFORM,
            TMS,
            Singlet(shift_ppm=4.750, protons=0.55, width_hz=4.0),
            Singlet(shift_ppm=2.170, protons=0.09),
        ),
        noise=5.0e-4,
        seed=1171,
        axis_error_ppm=0.029,
        phase_deg=-64.0,
        form="jcamp",
    ),
    Sample(
        name="batch-118",
        solvent="CDCl3",
        title="Batch 118, labelled hydroxy ester",
        date_s=1793086400,
        groups=(
            Group(label="1'A", n_spins=1, shift_ppm=4.2420),
            Group(label="1'B", n_spins=1, shift_ppm=4.2330),
            Group(label="2", n_spins=1, shift_ppm=4.1320),
            Group(label="OH", n_spins=1, shift_ppm=2.790, width_hz=5.0),
            Group(label="3A", n_spins=1, shift_ppm=1.8260),
            Group(label="3B", n_spins=1, shift_ppm=1.6710),
            Group(label="2'", n_spins=3, shift_ppm=1.2960),
            Group(label="4", n_spins=3, shift_ppm=0.9540),
        ),
        couplings_hz={
            ("1'A", "2'"): 7.14,
            ("1'B", "2'"): 7.14,
            ("1'A", "1'B"): -10.80,
            ("2", "3A"): 4.20,
            ("2", "3B"): 6.85,
            ("3A", "3B"): -14.10,
            ("3A", "4"): 7.45,
            ("3B", "4"): 7.45,
        },
        singlets=(
            CHLOROFORM,
            TMS,
            Singlet(shift_ppm=1.560, protons=0.30, width_hz=2.5),
            Singlet(shift_ppm=5.300, protons=0.05),
        ),
        noise=4.0e-4,
        seed=118,
        axis_error_ppm=0.030,
        phase_deg=112.0,
        form="bruker",
    ),
    Sample(
        name="batch-121",
        solvent="D2O",
        title="Batch 121, sodium salt of the hydroxy acid",
        date_s=1793172800,
        groups=(
            Group(label="3", n_spins=1, shift_ppm=4.1460),
            Group(label="2A", n_spins=1, shift_ppm=2.4060),
            Group(label="2B", n_spins=1, shift_ppm=2.3020),
            Group(label="4", n_spins=3, shift_ppm=1.1950),
        ),
        couplings_hz={
            ("3", "4"): 6.27,
            ("3", "2A"): 7.26,
            ("3", "2B"): 6.24,
            ("2A", "2B"): -14.48,
        },
        singlets=(
            Singlet(shift_ppm=0.0, protons=1.6),
            Singlet(shift_ppm=4.770, protons=9.0, width_hz=3.0),
        ),
        noise=4.0e-4,
        seed=121,
        axis_error_ppm=0.084,
        phase_deg=-15.0,
        form="jcamp",
    ),
    Sample(
        name="batch-130",
        solvent="CDCl3",
        title="Batch 130, 2-methyl ester, both diastereomers",
        date_s=1793259200,
        groups=(
            *methyl_ester(c3=3.8820, c2=2.4420, methyl=1.1790, c4=1.2210),
            Group(label="OH", n_spins=1, shift_ppm=2.720, width_hz=9.0),
        ),
        couplings_hz=methyl_ester_j(7.10),
        singlets=(
            CHLOROFORM,
            TMS,
            Singlet(shift_ppm=1.560, protons=0.30, width_hz=2.5),
        ),
        noise=4.0e-4,
        seed=130,
        axis_error_ppm=0.030,
        phase_deg=58.0,
        form="jcamp",
        companions=(
            Companion(
                share=28.0 / 72.0,
                groups=(
                    *methyl_ester(c3=4.0710, c2=2.5130, methyl=1.1960, c4=1.1610),
                    Group(label="OH", n_spins=1, shift_ppm=2.720, width_hz=9.0),
                ),
                couplings_hz=methyl_ester_j(3.90),
            ),
        ),
    ),
)
STRUCTURES = {
    "hydroxy-ester": "C[C@@H](O)CC(=O)OCC",
    "wrong-isomer": "CCC(O)C(=O)OCC",
    "hydroxy-acid-salt": "CC(O)CC(=O)[O-].[Na+]",
    "anti-methyl-ester": "C[C@@H](O)[C@@H](C)C(=O)OCC",
    "syn-methyl-ester": "C[C@@H](O)[C@H](C)C(=O)OCC",
}
CANDIDATES = (
    ("C[C@@H](O)CC(=O)OCC", "3-hydroxy ester"),
    ("CCC(O)C(=O)OCC", "2-hydroxy ester"),
    ("OCCCC(=O)OCC", "4-hydroxy ester"),
    ("CCOC(C)CC(=O)O", "3-ethoxy acid"),
)

MIXTURE = (
    (STRUCTURES["anti-methyl-ester"], "anti ester"),
    (STRUCTURES["syn-methyl-ester"], "syn ester"),
)


def sample_lines(sample: Sample) -> list[tuple[float, float, float]]:
    """Offset from the carrier (Hz), area (protons) and width (Hz) of every line."""
    lines = spin_lines(sample.groups, sample.couplings_hz)
    for one in sample.companions:
        lines += [
            (at_hz, area * one.share, width_hz)
            for at_hz, area, width_hz in spin_lines(one.groups, one.couplings_hz)
        ]
    lines += [(offset_hz(s.shift_ppm), s.protons, s.width_hz) for s in sample.singlets]
    return lines + carbon_satellites(sample)


def spin_lines(
    groups: tuple[Group, ...], couplings_hz: dict[tuple[str, str], float]
) -> list[tuple[float, float, float]]:
    """The same for the spin system of one compound."""
    labels = [group.label for group in groups]
    couplings = np.zeros((len(labels), len(labels)))
    for (first, second), j_hz in couplings_hz.items():
        i, k = labels.index(first), labels.index(second)
        couplings[i, k] = couplings[k, i] = j_hz
    system = SpinSystem(
        n_spins=np.array([group.n_spins for group in groups]),
        frequencies_hz=np.array([offset_hz(group.shift_ppm) for group in groups]),
        couplings_hz=couplings,
        nuclei=("1H",) * len(labels),
    )
    transitions = simulate(system)
    return [
        (float(frequency), float(area), groups[particle].width_hz)
        for particle, areas in zip(
            transitions.observed, transitions.intensities, strict=True
        )
        for frequency, area in zip(transitions.frequencies_hz, areas, strict=True)
        if abs(area) > 1e-5
    ]


def carbon_satellites(sample: Sample) -> list[tuple[float, float, float]]:
    """13C satellites of the sharp singlets: 0.55 % each side (natural abundance).

    One-bond couplings of 118 Hz (SiCH3), 127 Hz (CH3) and 209 Hz (CHCl3) are
    common practice.
    """
    satellites = []
    for singlet in sample.singlets:
        if singlet.width_hz > 1.0:
            continue
        one_bond_hz = {7.260: 209.0, 0.0: 118.0}.get(singlet.shift_ppm, 127.0)
        for side in (-0.5, 0.5):
            at = offset_hz(singlet.shift_ppm) + side * one_bond_hz
            satellites.append((at, 0.0055 * singlet.protons, singlet.width_hz))
    return satellites


def offset_hz(shift_ppm: float) -> float:
    """Distance from the carrier."""
    return (shift_ppm - CARRIER_PPM) * FIELD_MHZ


def make_fid(sample: Sample) -> npt.NDArray[np.complex128]:
    """The FID as the receiver would hand it over, delay included, unit scale."""
    return fid_of(sample_lines(sample), sample)


def fid_of(
    lines: list[tuple[float, float, float]], sample: Sample
) -> npt.NDArray[np.complex128]:
    """FID of any lines, measured like a sample: its noise, seed and phase."""
    rng = np.random.default_rng(sample.seed)
    times_s = np.arange(2 * N_POINTS) / WIDTH_HZ
    fid = np.zeros(times_s.size, dtype=np.complex128)
    for at_hz, area, width_hz in lines:
        fid += area * np.exp((2j * np.pi * at_hz - np.pi * width_hz) * times_s)
    # A shim that is a little off: a tenth of every line stands 0.7 Hz to one side.
    fid *= 0.9 + 0.1 * np.exp(2j * np.pi * 0.7 * times_s)
    fid[0] *= 0.5
    fid *= np.exp(1j * np.deg2rad(sample.phase_deg))
    delayed = delay(fid)[:N_POINTS]
    scale = np.abs(delayed).max()
    noise = rng.standard_normal((2, N_POINTS)) * sample.noise * scale
    # The first points after the delay are a little wrong: the baseline drifts.
    start = int(GROUP_DELAY_POINTS)
    delayed[start : start + 3] *= 1.0 + 0.004 * rng.standard_normal(3)
    return np.asarray((delayed + noise[0] + 1j * noise[1]) / scale)


def delay(fid: npt.NDArray[np.complex128]) -> npt.NDArray[np.complex128]:
    """Digital-filter delay, fractional part included, as a phase over the band."""
    cycles = np.fft.fftfreq(fid.size)
    shifted = np.fft.fft(fid) * np.exp(-2j * np.pi * cycles * GROUP_DELAY_POINTS)
    return np.asarray(np.fft.ifft(shifted))


def counts_of(fid: npt.NDArray[np.complex128]) -> npt.NDArray[np.int32]:
    """Interleaved real and imaginary counts of the digitiser, shape (2 n,)."""
    interleaved = np.column_stack([fid.real, fid.imag]).ravel()
    return np.round(interleaved * PEAK_COUNTS).astype(np.int32)


def header_frequency_mhz(sample: Sample) -> float:
    """Frequency that the header calls 0 ppm: the lock is off by a little."""
    return FIELD_MHZ * (1.0 + sample.axis_error_ppm * 1e-6)


def write_bruker(sample: Sample, folder: Path) -> None:
    """A dataset folder: ``fid`` and ``acqus``."""
    run = folder / "10"
    run.mkdir(parents=True)
    (run / "fid").write_bytes(counts_of(make_fid(sample)).astype("<i4").tobytes())
    zero_mhz = header_frequency_mhz(sample)
    carrier_mhz = FIELD_MHZ * (1.0 + CARRIER_PPM * 1e-6)
    facts = {
        "AQ_mod": 3, "BF1": zero_mhz, "BYTORDA": 0,
        "D": "(0..3)\n0 2 0 0", "DATE": sample.date_s, "DECIM": 2496,
        "DSPFVS": 20, "DTYPA": 0, "GRPDLY": GROUP_DELAY_POINTS, "NS": 16,
        "NUC1": "<1H>", "O1": (carrier_mhz - zero_mhz) * 1e6,
        "P": "(0..3)\n0 10.5 0 0", "PARMODE": 0,
        "PULPROG": f"<{sample.pulse_program}>", "RG": 64,
        "SFO1": carrier_mhz, "SOLVENT": f"<{sample.solvent}>",
        "SW": WIDTH_HZ / carrier_mhz, "SW_h": WIDTH_HZ, "TD": 2 * N_POINTS,
        "TE": 298.0,
    }  # fmt: skip
    lines = [
        "##TITLE= Parameter file", "##JCAMPDX= 5.0", "##DATATYPE= Parameter Values",
        "##ORIGIN= simulated", "##OWNER= sample data",
        *(f"##${name}= {value!s}" for name, value in facts.items()), "##END=", "",
    ]  # fmt: skip
    (run / "acqus").write_text("\n".join(lines), newline="\n")
    (run / "pdata" / "1").mkdir(parents=True)
    (run / "pdata" / "1" / "title").write_text(sample.title + "\n", newline="\n")


def write_jcamp(sample: Sample, folder: Path) -> None:
    """A FID as JCAMP-DX 6.00 NTUPLES, ordinates in AFFN form."""
    folder.mkdir(parents=True)
    counts = counts_of(make_fid(sample)).reshape(-1, 2)
    carrier_mhz = FIELD_MHZ * (1.0 + CARRIER_PPM * 1e-6)
    last_s = (N_POINTS - 1) / WIDTH_HZ
    zero_mhz = header_frequency_mhz(sample)
    edge_ppm = CARRIER_PPM + WIDTH_HZ / 2 / FIELD_MHZ - sample.axis_error_ppm
    header = [
        f"##TITLE= {sample.title}", "##JCAMPDX= 6.00", "##DATA TYPE= NMR FID",
        "##DATA CLASS= NTUPLES", "##ORIGIN= simulated", "##OWNER= sample data",
        f"##.OBSERVE FREQUENCY= {carrier_mhz:.9f}", "##.OBSERVE NUCLEUS= ^1H",
        "##.ACQUISITION MODE= SIMULTANEOUS", "##.AVERAGES= 16",
        f"##.PULSE SEQUENCE= {sample.pulse_program}",
        f"##.SOLVENT NAME= {sample.solvent}",
        f"##.SHIFT REFERENCE= INTERNAL, {sample.solvent}, 1, {edge_ppm:.6f}",
        f"##$GRPDLY= {GROUP_DELAY_POINTS}", "##$DECIM= 2496", "##$DSPFVS= 20",
        f"##$SWH= {WIDTH_HZ}",
        "##$TE= 298.0",
        f"##$BF1= {zero_mhz:.9f}",
        f"##$O1= {(carrier_mhz - zero_mhz) * 1e6:.6f}",
        "##NTUPLES= NMR FID",
        "##VAR_NAME= TIME, FID/REAL, FID/IMAG, PAGE NUMBER",
        "##SYMBOL= X, R, I, N",
        "##VAR_TYPE= INDEPENDENT, DEPENDENT, DEPENDENT, PAGE",
        "##VAR_FORM= AFFN, ASDF, ASDF, AFFN",
        f"##VAR_DIM= {N_POINTS}, {N_POINTS}, {N_POINTS}, 2",
        "##UNITS= SECONDS, ARBITRARY UNITS, ARBITRARY UNITS,",
        f"##FIRST= 0, {counts[0, 0]}, {counts[0, 1]}, 1",
        f"##LAST= {last_s:.9f}, {counts[-1, 0]}, {counts[-1, 1]}, 2",
        f"##MIN= 0, {counts[:, 0].min()}, {counts[:, 1].min()}, 1",
        f"##MAX= {last_s:.9f}, {counts[:, 0].max()}, {counts[:, 1].max()}, 2",
        f"##FACTOR= {1 / WIDTH_HZ:.12g}, 1, 1, 1",
    ]  # fmt: skip
    for page, symbol in ((1, "R"), (2, "I")):
        header += [
            f"##PAGE= N={page}",
            f"##DATA TABLE= (X++({symbol}..{symbol})), XYDATA",
        ]
        header += jcamp_rows(counts[:, page - 1])
    header += ["##END NTUPLES= NMR FID", "##END=", ""]
    (folder / "fid.dx").write_text("\n".join(header), newline="\n")


def jcamp_rows(ordinates: npt.NDArray[np.int32]) -> list[str]:
    """Rows of at most 80 characters: the abscissa's index, then ordinates."""
    rows, row = [], ""
    for index, value in enumerate(ordinates):
        word = f" {value:d}"
        if row and len(row) + len(word) > 80:
            rows.append(row)
            row = ""
        row = row + word if row else f"{index:d}{word}"
    return [*rows, row]


def write_structures(folder: Path) -> None:
    """Molfiles with drawn coordinates and a list of candidates."""
    folder.mkdir(parents=True)
    for name, smiles in STRUCTURES.items():
        molecule = Chem.MolFromSmiles(smiles)
        AllChem.Compute2DCoords(molecule)
        molecule.SetProp("_Name", name)
        lines = Chem.MolToMolBlock(molecule).split("\n")
        lines[1] = ""  # program and time stamp: the file stays the same every run
        (folder / f"{name}.mol").write_text("\n".join(lines), newline="\n")
    text = "".join(f"{smiles} {name}\n" for smiles, name in CANDIDATES)
    (folder / "candidates.smi").write_text(text, newline="\n")
    text = "".join(f"{smiles} {name}\n" for smiles, name in MIXTURE)
    (folder / "mixture.smi").write_text(text, newline="\n")


def files_below(folder: Path) -> list[Path]:
    """Data and structure files, in a fixed order."""
    return sorted(path for path in folder.rglob("*") if path.is_file())


def write_table(readme: Path) -> None:
    """Replace the table of files and hashes in README.md."""
    rows = ["| file | SHA-256 |", "|---|---|"]
    for name in [*(sample.name for sample in SAMPLES), "structures"]:
        for path in files_below(HERE / name):
            digest = hashlib.sha256(path.read_bytes()).hexdigest()
            rows.append(f"| {path.relative_to(HERE).as_posix()} | `{digest}` |")
    head = readme.read_text(encoding="utf-8").split("<!-- files -->")[0]
    text = head + "<!-- files -->\n" + "\n".join(rows) + "\n"
    readme.write_text(text, encoding="utf-8", newline="\n")


def main() -> None:
    """Write everything anew."""
    writers = {"bruker": write_bruker, "jcamp": write_jcamp}
    for sample in SAMPLES:
        folder = HERE / sample.name
        shutil.rmtree(folder, ignore_errors=True)
        writers[sample.form](sample, folder)
    shutil.rmtree(HERE / "structures", ignore_errors=True)
    write_structures(HERE / "structures")
    write_table(HERE / "README.md")


if __name__ == "__main__":
    main()
