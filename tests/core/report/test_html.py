"""The HTML page: its parts, its words, and that it needs nothing from outside."""

import re
from dataclasses import replace
from html.parser import HTMLParser

import pytest

from invented_ledger import invented_ledger, overlapped_ledger
from spinledger.project.document import AuditLine, Sample, SignOff
from spinledger.report.cautions import accuracy_ppm, printed_cautions
from spinledger.report.compare import compare_lists, list_of_ledger
from spinledger.report.context import ReportContext
from spinledger.report.html import report_html
from spinledger.report.published import parse_published
from spinledger.values.acquisition import Metadata
from spinledger.values.evidence import ProcessingQuality
from spinledger.values.ledger import Verdict

VOID = {"meta", "br", "img", "link", "hr", "input"}


class Balance(HTMLParser):
    """Checks that every tag is closed in order, and gathers the text."""

    def __init__(self) -> None:
        super().__init__()
        self.stack: list[str] = []
        self.words: list[str] = []

    def handle_starttag(self, tag: str, _attrs: object) -> None:
        if tag not in VOID:
            self.stack.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.stack, f"</{tag}> without a start"
        assert self.stack.pop() == tag

    def handle_startendtag(self, _tag: str, _attrs: object) -> None:
        return

    def handle_data(self, data: str) -> None:
        if "style" not in self.stack and "title" not in self.stack:
            self.words.append(data)


def words_of(page: str) -> str:
    parser = Balance()
    parser.feed(page)
    assert parser.stack == []
    return " ".join(" ".join(parser.words).replace("\u00a0", " ").split())


def test_page_is_well_formed_and_refers_to_nothing_outside() -> None:
    page = report_html(invented_ledger())
    words_of(page)
    outside = re.findall(r"""(?:src|href|url)\s*[=(]\s*["']?(?!#)([^"')\s>]+)""", page)
    assert [one for one in outside if not one.startswith("(#")] == []
    assert "<script" not in page


def test_sections_stand_in_the_order_of_the_drawing() -> None:
    words = words_of(report_html(invented_ledger()))
    order = [
        "Reconciliation report",
        "Ethyl 3-hydroxybutanoate",
        "Consistent with the drawn structure",
        "Evidence and claims",
        "Assignment",
        "Balance",
        "For the experimental section",
        "Cautions",
        "Expansions",
        "Strays",
        "Contenders",
        "Next measurement",
        "Audit trail",
    ]
    places = [words.index(one) for one in order]
    assert places == sorted(places)


def test_words_of_the_bench_do_not_leave() -> None:
    ledger = replace(
        overlapped_ledger(),
        verdict=Verdict(
            state="not reconciled",
            probability=0.02,
            prior=0.5,
            likelihood_ratio=0.02,
            unique=True,
            reasons=("4-H is disputed.", "All others are settled."),
        ),
    )
    words = words_of(report_html(ledger)).lower()
    for banned in ("settled", "disputed", "reconciled"):
        assert banned not in words.replace("reconciliation", "")
    assert "inconsistent with the drawn structure" in words
    assert "4-h is inconsistent." in words


def test_probability_stands_with_prior_and_likelihood_ratio() -> None:
    words = words_of(report_html(invented_ledger()))
    assert "probability 0.97 (prior 0.5, likelihood ratio 32.3)" in words


def test_verdict_before_hand_edits_stays_visible() -> None:
    before = Verdict(
        state="undecided",
        probability=0.4,
        prior=0.5,
        likelihood_ratio=0.7,
        unique=False,
        reasons=(),
    )
    edited = replace(invented_ledger(), edits=("2-HA put to the signal at 2.49 ppm",))
    context = ReportContext(verdict_before_edits=before)
    words = words_of(report_html(edited, context))
    assert "Before hand edits: undecided, probability 0.4." in words
    assert "1 hand edit was made" in words
    assert "2-HA put to the signal at 2.49 ppm." in words


def test_audit_trail_holds_hash_recipe_and_versions() -> None:
    words = words_of(report_html(invented_ledger()))
    assert "7c1e40d9a2b351f8" * 4 in words
    assert "Digital-filter delay of 67.98 points taken out" in words
    assert re.search(r"Made with spinledger \S+ python", words.replace(",", ""))


def test_audit_trail_says_how_far_the_processing_is_to_be_trusted() -> None:
    ledger = invented_ledger()
    quality = ProcessingQuality(
        phase_sd_deg=4.26, baseline_sd=1.5, doubts=("The phase is doubtful.",)
    )
    doubtful = replace(ledger, evidence=replace(ledger.evidence, quality=quality))
    words = words_of(report_html(doubtful)).replace("\u00a0", " ")
    assert "estimated error 4.3 degrees in the worst signal" in words
    assert "1.5 noise sd over the signal-free stretches" in words
    assert "The phase is doubtful." in words


def test_sample_records_and_signatures_are_printed() -> None:
    context = ReportContext(
        date="1 December 2026",
        sample=Sample(
            name="tube 7",
            sign_offs=(SignOff(role="Reviewed by", name="N. N.", when="2026-12-01"),),
        ),
        audit=(AuditLine(when="2026-12-01T10:00+01:00", what="Read.", by_hand=True),),
    )
    words = words_of(report_html(invented_ledger(), context))
    assert "tube 7, 400.13 MHz ¹H in CDCl 3 , 298.0 K" in words
    assert "Reviewed by N. N. 2026-12-01" in words
    assert "2026-12-01T10:00+01:00 by hand: Read." in words


def test_a_published_list_is_printed_beside_the_ledger() -> None:
    ledger = invented_ledger()
    published = parse_published(
        "1H NMR (400 MHz, CDCl3) 4.20 (m, 1H), 4.18 (q, J = 7.2 Hz, 2H), 1.28 (t, 3H), "
        "8.10 (s, 1H)"
    )
    comparison = compare_lists(list_of_ledger(ledger), published)
    assert "Published list" not in words_of(report_html(ledger))
    words = words_of(report_html(ledger, ReportContext(comparison=comparison)))
    assert "One common offset of −0.010 ppm (here minus published)" in words
    assert "7.1 / 7.2" in words
    assert "8.10 only published" in words


def test_names_with_markup_are_shown_as_text() -> None:
    ledger = invented_ledger()
    named = replace(ledger, structure=replace(ledger.structure, name="<b>A & B</b>"))
    page = report_html(named)
    assert "&lt;b&gt;A &amp; B&lt;/b&gt;" in page
    assert "<b>A & B" not in page


def test_parts_can_be_left_out_and_unknown_ones_are_refused() -> None:
    page = report_html(
        invented_ledger(), ReportContext(sections=("assignment", "text"))
    )
    words = words_of(page)
    assert "Assignment" in words
    assert "Expansions" not in words
    with pytest.raises(ValueError, match="no such part 'poem'"):
        ReportContext(sections=("poem",))


def with_metadata(**changes: object) -> object:
    ledger = invented_ledger()
    facts: Metadata = replace(ledger.evidence.metadata, **changes)  # type: ignore[arg-type]
    return replace(ledger, evidence=replace(ledger.evidence, metadata=facts))


def test_cautions_come_once_and_only_where_they_apply() -> None:
    plain = printed_cautions(invented_ledger())
    assert len(plain) == len(set(plain))
    assert not any("interchangeable" in one for one in plain)
    overlapped = " ".join(printed_cautions(overlapped_ledger()))
    assert "interchangeable" in overlapped
    assert "absolute configuration" in overlapped
    assert not any("hand edit" in one for one in plain)


def test_reported_shifts_carry_the_doubt_of_their_conditions() -> None:
    # 0.005 ppm of conditions and 0.0005 ppm of the reference in quadrature.
    assert accuracy_ppm(invented_ledger()) == pytest.approx(0.005025, abs=1e-6)
    unknown = with_metadata(temperature_k=None)
    assert accuracy_ppm(unknown) == pytest.approx(0.0100125, abs=1e-6)  # type: ignore[arg-type]
