"""Geometry and side evidence in ledger.json: additive keys, plain values."""

from dataclasses import replace

from invented_ledger import invented_ledger
from spinledger.report.html import report_html
from spinledger.report.json_ledger import ledger_to_json
from spinledger.values.geometry import ConfigurationOdds


def test_geometry_is_written_with_its_odds_and_sentences() -> None:
    ledger = invented_ledger()
    assert ledger.geometry is not None
    rows = (
        ConfigurationOdds(
            smiles="C", name="trans", probability=0.9, is_drawn=True, misfit_sd=0.4
        ),
        ConfigurationOdds(
            smiles="CC", name="cis", probability=0.1, is_drawn=False, misfit_sd=3.1
        ),
    )
    geometry = replace(
        ledger.geometry, configurations=rows, sentences=("the couplings favour trans",)
    )
    told = replace(ledger, geometry=geometry)
    tree = ledger_to_json(told)
    assert tree["schema"] == 1
    assert tree["side"][0]["kind"] == "COSY"
    listed = tree["geometry"]["configurations"]
    assert [(one["name"], one["probability"], one["drawn"]) for one in listed] == [
        ("trans", 0.9, True),
        ("cis", 0.1, False),
    ]
    row = tree["geometry"]["dihedrals"][0]
    assert (row["claim"], row["partner"]) == ("2-HA", "3-H")
    assert "The couplings favour trans." in report_html(told)


def test_no_geometry_is_null_and_prints_nothing() -> None:
    ledger = replace(invented_ledger(), geometry=None, side=())
    tree = ledger_to_json(ledger)
    assert tree["geometry"] is None
    assert tree["side"] == []
    assert "Geometry by the couplings" not in report_html(ledger)
