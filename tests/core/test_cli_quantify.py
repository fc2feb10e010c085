"""``spinledger quantify``: words in, sentences, a section and a file out."""

import io
import json
import zipfile
from pathlib import Path

import pytest

from quantity_weighed import STANDARD_PPM, weighed_ledger
from spinledger.cli import main, quantify
from spinledger.cli.reconcile import sections_of
from spinledger.errors import UsageError
from spinledger.report.context import SECTIONS, ReportContext
from spinledger.report.html import report_html
from spinledger.values.ledger import Ledger

# The same tube as in the tests of the content: 98.0 % by hand.
STANDARD = [
    "--standard-structure", "COc1cc(OC)cc(OC)c1", "--standard-protons", "3",
    "--standard-at", str(STANDARD_PPM), "--standard-mass", "5.0", "--sample-mass",
    "8.0", "--balance", "0.01", "--standard-purity", "0.998", "--standard-purity-u",
    "0.001", "--standard-name", "trimethoxybenzene",
]  # fmt: skip


@pytest.fixture
def tube(monkeypatch: pytest.MonkeyPatch) -> list[Ledger]:
    """The ledger that the command works on; may be replaced."""
    held = [weighed_ledger()]
    monkeypatch.setattr(quantify, "_ledger", lambda _arguments: held[0])
    return held


def test_content_with_its_uncertainty(
    tmp_path: Path, tube: list[Ledger], capsys: pytest.CaptureFixture[str]
) -> None:
    words = ["quantify", "spectrum", "--structure", "C", "--out", str(tmp_path)]
    assert main([*words, *STANDARD, "--formats", "html,docx,xlsx"]) == 0
    said = capsys.readouterr().out
    assert "by mass (coverage factor 2), against trimethoxybenzene." in said
    assert "acetone:" in said
    tree = json.loads((tmp_path / "quantity.json").read_text("utf-8"))
    budget = tree["purity"]["budget"]
    # 5.000 * 0.998 / 168.19 / 0.5 * 132.16 / 8.000, see the tests of the content.
    assert budget["value"] == pytest.approx(0.98027, rel=5e-3)
    assert budget["expanded"] == pytest.approx(2 * budget["standard_uncertainty"])
    html = (tmp_path / "report.html").read_text("utf-8")
    assert "<h3>Amounts</h3>" in html
    assert "Incomplete relaxation" in html
    with zipfile.ZipFile(io.BytesIO((tmp_path / "report.docx").read_bytes())) as file:
        assert "Incomplete relaxation" in file.read("word/document.xml").decode()
    with zipfile.ZipFile(io.BytesIO((tmp_path / "report.xlsx").read_bytes())) as file:
        assert 'name="Budget"' in file.read("xl/workbook.xml").decode()


def test_refusal_is_a_result_with_its_reason(
    tmp_path: Path, tube: list[Ledger], capsys: pytest.CaptureFixture[str]
) -> None:
    tube[0] = weighed_ledger(pulse_angle_deg=30.0, delay_s=1.0)
    words = ["quantify", "spectrum", "--structure", "C", "--out", str(tmp_path)]
    assert main([*words, *STANDARD]) == 0
    said = capsys.readouterr().out
    assert said.startswith("No content is given. The pulse is 30°")
    assert (
        json.loads((tmp_path / "quantity.json").read_text())["purity"]["budget"] is None
    )


def test_half_a_standard_is_wrong_usage(
    tmp_path: Path, tube: list[Ledger], capsys: pytest.CaptureFixture[str]
) -> None:
    words = ["quantify", "spectrum", "--out", str(tmp_path), "--standard-mass", "5"]
    assert main(words) == 2
    assert "--standard-structure is needed" in capsys.readouterr().err


def test_every_report_says_what_the_strays_amount_to() -> None:
    page = report_html(weighed_ledger(), ReportContext(sections=("quantity",)))
    assert "<td>acetone</td>" in page
    short = report_html(weighed_ledger(delay_s=1.0), ReportContext())
    assert "No amounts are given." in short


def test_sections_are_chosen_by_words() -> None:
    assert sections_of(None) == SECTIONS
    assert sections_of("text,assignment") == ("text", "assignment")
    assert sections_of("-audit,-signatures") == tuple(
        one for one in SECTIONS if one not in ("audit", "signatures")
    )
    with pytest.raises(UsageError, match="'poem' is not known"):
        sections_of("text,poem")
