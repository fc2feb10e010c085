"""The main job on the sample data, as a user runs it, and its common-practice facts."""

import hashlib
import json
import re
from pathlib import Path
from typing import Any

import pytest

from spinledger.cli import main

SAMPLES = Path(__file__).resolve().parents[2] / "sample_data"
ESTER = SAMPLES / "structures" / "hydroxy-ester.mol"
SALT = SAMPLES / "structures" / "hydroxy-acid-salt.mol"


def reconcile(data: str, structure: Path, out: Path) -> dict[str, Any]:
    arguments = ["reconcile", str(SAMPLES / data), "--structure", str(structure)]
    assert main([*arguments, "--contenders", "0", "--out", str(out)]) == 0
    ledger: dict[str, Any] = json.loads(
        (out / "ledger.json").read_text(encoding="utf-8")
    )
    return ledger


def test_every_sample_file_has_the_hash_of_the_table() -> None:
    table = (SAMPLES / "README.md").read_text(encoding="utf-8")
    rows = re.findall(r"^\| (\S+) \| `([0-9a-f]{64})` \|$", table, re.MULTILINE)
    assert len(rows) >= 10
    for name, digest in rows:
        assert hashlib.sha256((SAMPLES / name).read_bytes()).hexdigest() == digest, name


def test_hydroxy_ester_is_reconciled_with_both_protons_of_the_pair(
    tmp_path: Path,
) -> None:
    ledger = reconcile("batch-117", ESTER, tmp_path)
    assert ledger["verdict"]["state"] == "reconciled"
    # The values that sample_data/make_samples.py put in.
    pair = sorted(
        e["shift_ppm"] for e in ledger["entries"] if e["protons"] == 1 and
        e["shift_ppm"] is not None and 2.3 < e["shift_ppm"] < 2.6
    )  # fmt: skip
    assert pair == pytest.approx([2.419, 2.491], abs=0.002)
    found = sorted(
        abs(c["j_hz"])
        for e in ledger["entries"]
        if e["shift_ppm"] is not None and abs(e["shift_ppm"] - 2.419) < 0.003
        for c in e["couplings"]
        if c["j_hz"] is not None
    )
    assert found == pytest.approx([8.60, 16.50], abs=0.15)


def test_acetone_trace_is_named_as_a_stray(tmp_path: Path) -> None:
    # Acetone in CDCl3 at 2.17: Fulmer et al., Organometallics 29 (2010) 2176,
    # doi:10.1021/om100106e, Table 1.
    ledger = reconcile("batch-117", ESTER, tmp_path)
    near = [s for s in ledger["strays"] if s["range_ppm"][0] < 2.17 < s["range_ppm"][1]]
    assert [stray["kind"] for stray in near] == ["impurity"]
    assert "cetone" in near[0]["why"]


def test_wrong_isomer_is_not_reconciled(tmp_path: Path) -> None:
    ledger = reconcile("batch-118", ESTER, tmp_path)
    assert ledger["verdict"]["state"] == "not reconciled"


def test_hydroxyl_in_heavy_water_is_not_expected(tmp_path: Path) -> None:
    # Common practice: OH exchanges for OD in D2O and is not seen.
    ledger = reconcile("batch-121", SALT, tmp_path)
    silent = [e for e in ledger["entries"] if e["state"] == "silent"]
    assert [entry["atoms"] for entry in silent] == [[2]]
    assert ledger["verdict"]["state"] == "reconciled"


def test_the_same_data_give_the_same_ledger(tmp_path: Path) -> None:
    first = reconcile("batch-117-shaken", ESTER, tmp_path / "one")
    second = reconcile("batch-117-shaken", ESTER, tmp_path / "two")
    assert first == second


def test_raw_data_are_not_written_to(tmp_path: Path) -> None:
    def state() -> dict[str, tuple[int, int]]:
        return {
            str(p): (p.stat().st_mtime_ns, p.stat().st_size)
            for p in (SAMPLES / "batch-117").rglob("*")
        }

    before = state()
    reconcile("batch-117", ESTER, tmp_path)
    assert state() == before
