"""ledger.json, key by key against the written schema 1."""

import json
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from invented_ledger import invented_ledger, overlapped_ledger, with_entry
from spinledger.report.json_ledger import (
    LedgerFileError,
    ledger_text,
    ledger_to_json,
    read_ledger_json,
    visible_protons,
)
from spinledger.values.evidence import ProcessingQuality
from spinledger.values.ledger import EntryCoupling

NUMBER = (int, float)
MAYBE = (int, float, type(None))
TEXT = (str,)
MAYBE_TEXT = (str, type(None))
# The example of the design page, key by key.
SCHEMA: dict[str, Any] = {
    "schema": int,
    "spectrum": {
        "source": TEXT,
        "sha256": TEXT,
        "field_mhz": NUMBER,
        "nucleus": TEXT,
        "solvent": MAYBE_TEXT,
        "solvent_seen": MAYBE_TEXT,
        "reference": {"by": TEXT, "sd_ppm": NUMBER},
    },
    "structure": {"smiles": TEXT, "visible_protons": NUMBER},
    "entries": [
        {
            "claim": TEXT,
            "atoms": list,
            "species": int,
            "protons": int,
            "state": TEXT,
            "predicted_shift_ppm": NUMBER,
            "predicted_shift_sd_ppm": NUMBER,
            "shift_ppm": MAYBE,
            "shift_sd_ppm": MAYBE,
            "range_ppm": (list, type(None)),
            "integral_protons": MAYBE,
            "multiplicity": MAYBE_TEXT,
            "group": (dict, type(None)),
            "couplings": [
                {
                    "partner": TEXT,
                    "j_hz": MAYBE,
                    "determined": bool,
                    "j_sd_hz": MAYBE,
                    "predicted_j_hz": NUMBER,
                    "predicted_j_sd_hz": NUMBER,
                }
            ],
        }
    ],
    "strays": [{"range_ppm": list, "kind": TEXT, "why": TEXT}],
    "balance": {"claimed": NUMBER, "found": NUMBER},
    "verdict": {
        "state": TEXT,
        "probability": MAYBE,
        "prior": NUMBER,
        "likelihood_ratio": MAYBE,
        "unique": bool,
        "reasons": list,
    },
    "contenders": list,
    "advice": list,
    "recipe": list,
    "edits": list,
    "versions": dict,
}


def check(tree: Any, schema: Any, place: str) -> None:
    if isinstance(schema, dict):
        assert isinstance(tree, dict), place
        for key, part in schema.items():
            assert key in tree, f"{place}.{key} is missing"
            check(tree[key], part, f"{place}.{key}")
    elif isinstance(schema, list):
        assert isinstance(tree, list), place
        for item in tree:
            check(item, schema[0], f"{place}[]")
    else:
        assert isinstance(tree, schema), f"{place}: {type(tree)}"


@pytest.mark.parametrize("ledger", [invented_ledger(), overlapped_ledger()])
def test_every_key_of_schema_1_is_there_with_its_type(ledger: Any) -> None:
    tree = json.loads(ledger_text(ledger))
    check(tree, SCHEMA, "ledger")
    assert tree["schema"] == 1


def test_values_come_through_unchanged() -> None:
    tree = ledger_to_json(invented_ledger())
    assert tree["structure"] | {} == tree["structure"]
    assert tree["structure"]["smiles"] == "CCOC(=O)CC(C)O"
    assert tree["structure"]["visible_protons"] == 12
    assert tree["spectrum"]["reference"]["by"] == "TMS"
    assert tree["spectrum"]["source"] == "batch-117"
    entry = next(one for one in tree["entries"] if one["claim"] == "2-HA")
    assert entry["atoms"] == [5]
    assert entry["shift_ppm"] == 2.491
    assert entry["couplings"][0] | {} == {
        "partner": "2-HB",
        "j_hz": -16.5,
        "determined": True,
        "j_sd_hz": 0.02,
        "predicted_j_hz": -16.0,
        "predicted_j_sd_hz": 1.0,
        "kind": "geminal",
        "disputed": False,
    }
    low, high = entry["range_ppm"]
    assert low < 2.491 < high


def test_partners_are_claims_and_every_coupling_stands_in_both_entries() -> None:
    tree = ledger_to_json(invented_ledger())
    seen = {
        (entry["claim"], one["partner"]): one["j_hz"]
        for entry in tree["entries"]
        for one in entry["couplings"]
    }
    assert seen
    for (claim, partner), j_hz in seen.items():
        assert seen[partner, claim] == j_hz


def test_an_undetermined_coupling_is_null_with_its_sum() -> None:
    unknown = EntryCoupling(
        partner="2'-H",
        j_hz=7.3,  # what the fit happened to end at must not get out
        j_sd_hz=9.0,
        determined=False,
        predicted_j_hz=7.0,
        predicted_j_sd_hz=1.5,
        kind="vicinal chain",
        sum_hz=14.2,
    )
    tree = ledger_to_json(with_entry(invented_ledger(), "1'-H", couplings=(unknown,)))
    entry = next(one for one in tree["entries"] if one["claim"] == "1'-H")
    coupling = entry["couplings"][0]
    assert coupling["j_hz"] is None
    assert coupling["j_sd_hz"] is None
    assert coupling["determined"] is False
    assert coupling["sum_hz"] == 14.2


def test_group_is_written_with_kind_partners_and_odds() -> None:
    tree = ledger_to_json(overlapped_ledger())
    entry = next(one for one in tree["entries"] if one["claim"] == "2-HA")
    assert entry["group"] == {"kind": "interchangeable", "with": ["2-HB"], "odds": 0.6}


def test_silent_entry_has_no_shift_and_says_why() -> None:
    tree = ledger_to_json(overlapped_ledger())
    entry = next(one for one in tree["entries"] if one["claim"] == "3-OH")
    assert entry["shift_ppm"] is None
    assert entry["why"] == "Exchanged for deuterium."


def test_numbers_that_are_not_finite_become_null() -> None:
    ledger = with_entry(invented_ledger(), "4-H", shift_sd_ppm=float("inf"))
    entry = next(
        one for one in ledger_to_json(ledger)["entries"] if one["claim"] == "4-H"
    )
    assert entry["shift_sd_ppm"] is None
    json.loads(ledger_text(ledger))  # strict JSON


def test_structure_from_a_file_gives_the_canonical_smiles() -> None:
    ledger = invented_ledger()
    from_file = replace(
        ledger, structure=replace(ledger.structure, given="batch 117/ester.mol")
    )
    tree = ledger_to_json(from_file)
    assert tree["structure"]["smiles"] == ledger.structure.smiles
    assert tree["structure"]["given"] == "ester.mol"  # a name, never a path
    # Atoms are counted in the file's order, so its order goes along.
    assert tree["structure"]["molblock"] == ledger.structure.molblock
    assert "molblock" not in ledger_to_json(ledger)["structure"]


def test_visible_protons_of_a_mixture_are_weighted_by_share() -> None:
    ledger = invented_ledger()
    claims = ledger.claims
    two = replace(
        claims,
        claims=(
            replace(claims.claims[0], n_protons=1, species=0),
            replace(claims.claims[1], n_protons=1, species=1),
            replace(claims.claims[2], n_protons=5, visibility="silent"),
        ),
        species_shares=((0.36, 0.05), (0.64, 0.05)),
    )
    assert visible_protons(replace(ledger, claims=two)) == 1


def test_reader_takes_file_or_folder_and_refuses_the_rest(tmp_path: Path) -> None:
    (tmp_path / "ledger.json").write_text(ledger_text(invented_ledger()), "utf-8")
    assert read_ledger_json(tmp_path)["schema"] == 1
    other = tmp_path / "other.json"
    other.write_text('{"schema": 9, "entries": []}')
    with pytest.raises(LedgerFileError, match="schema 9 is not known"):
        read_ledger_json(other)
    other.write_text("not json")
    with pytest.raises(LedgerFileError, match=r"not a ledger\.json"):
        read_ledger_json(other)
    with pytest.raises(LedgerFileError, match="no such file"):
        read_ledger_json(tmp_path / "absent.json")


def test_quality_of_the_processing_stands_in_the_record() -> None:
    ledger = invented_ledger()
    quality = ProcessingQuality(
        phase_sd_deg=4.26, baseline_sd=1.5, doubts=("The phase is doubtful.",)
    )
    doubtful = replace(ledger, evidence=replace(ledger.evidence, quality=quality))
    spectrum = ledger_to_json(doubtful)["spectrum"]
    assert spectrum["quality"] == {"phase_sd_deg": 4.26, "baseline_sd": 1.5}
    assert "The phase is doubtful." in spectrum["doubts"]
