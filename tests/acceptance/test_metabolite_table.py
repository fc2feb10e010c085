"""Published shifts and couplings, simulated, then read back through the program.

Source of every number: Govindaraju, Young, Maudsley, NMR Biomed. 13 (2000)
129-153, doi:10.1002/1099-1492(200005)13:3<129::AID-NBM619>3.0.CO;2-V, Table 1,
with the corrigendum NMR Biomed. 28 (2015) 923-924, doi:10.1002/nbm.3336.
"""

import json
from dataclasses import dataclass
from pathlib import Path

import pytest

from make_samples import Group, Sample, Singlet, write_bruker
from spinledger.cli import main


@dataclass(frozen=True, slots=True, kw_only=True)
class Published:
    """One compound of the table; atoms are those of the SMILES."""

    name: str
    smiles: str
    groups: tuple[Group, ...]
    couplings_hz: dict[tuple[str, str], float]
    atom_of: dict[str, int]


LACTATE = Published(
    name="lactate",
    smiles="CC(O)C(=O)O",
    groups=(
        Group(label="2", n_spins=1, shift_ppm=4.0974),
        Group(label="3", n_spins=3, shift_ppm=1.3142),
    ),
    couplings_hz={("2", "3"): 6.933},
    atom_of={"2": 1, "3": 0},
)
ALANINE = Published(
    name="alanine",
    smiles="CC(N)C(=O)O",
    groups=(
        Group(label="2", n_spins=1, shift_ppm=3.7746),
        Group(label="3", n_spins=3, shift_ppm=1.4667),
    ),
    couplings_hz={("2", "3"): 7.234},
    atom_of={"2": 1, "3": 0},
)
ASPARTATE = Published(
    name="aspartate",
    smiles="NC(CC(=O)O)C(=O)O",
    groups=(
        Group(label="2", n_spins=1, shift_ppm=3.8914),
        Group(label="3", n_spins=1, shift_ppm=2.8011),
        Group(label="3'", n_spins=1, shift_ppm=2.6533),
    ),
    couplings_hz={("2", "3"): 3.647, ("2", "3'"): 9.107, ("3", "3'"): -17.426},
    atom_of={"2": 1, "3": 2, "3'": 2},
)
DSS = Singlet(shift_ppm=0.0, protons=1.5)
WATER = Singlet(shift_ppm=4.77, protons=6.0, width_hz=3.0)


def measure(published: Published, folder: Path) -> Path:
    """The compound in D2O as a raw data folder."""
    write_bruker(
        Sample(
            name=published.name,
            solvent="D2O",
            title=published.name,
            date_s=1793000000,
            groups=published.groups,
            couplings_hz=published.couplings_hz,
            singlets=(DSS, WATER),
            noise=4e-4,
            seed=7,
            axis_error_ppm=0.06,
            phase_deg=55.0,
            form="bruker",
        ),
        folder,
    )
    return folder


@pytest.mark.parametrize(
    "published", [LACTATE, ALANINE, ASPARTATE], ids=lambda p: p.name
)
def test_published_metabolite_is_read_back(
    published: Published, tmp_path: Path
) -> None:
    data = measure(published, tmp_path / published.name)
    out = tmp_path / "out"
    arguments = ["reconcile", str(data), "--structure", published.smiles]
    assert main([*arguments, "--contenders", "0", "--out", str(out)]) == 0
    ledger = json.loads((out / "ledger.json").read_text(encoding="utf-8"))

    assert ledger["spectrum"]["reference"]["by"] == "DSS"
    assert ledger["verdict"]["state"] == "reconciled"
    entries = {
        label: min(
            (
                entry
                for entry in ledger["entries"]
                if atom in entry["atoms"] and entry["shift_ppm"] is not None
            ),
            key=lambda entry: abs(entry["shift_ppm"] - shift_of(published, label)),
        )
        for label, atom in published.atom_of.items()
    }
    for label, entry in entries.items():
        # 0.001 ppm: the reference line is found to 0.0005 ppm on real spectra.
        assert entry["shift_ppm"] == pytest.approx(shift_of(published, label), abs=1e-3)
    for (first, second), j_hz in published.couplings_hz.items():
        found = {
            coupling["partner"]: coupling["j_hz"]
            for coupling in entries[first]["couplings"]
        }
        # 0.1 Hz: a ninth of the line width at signal-to-noise in the hundreds.
        assert abs(found[entries[second]["claim"]]) == pytest.approx(abs(j_hz), abs=0.1)


def shift_of(published: Published, label: str) -> float:
    return next(g.shift_ppm for g in published.groups if g.label == label)
