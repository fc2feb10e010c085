"""The PDF: every section, heads again on every page, no raster image."""

import re
import zlib
from dataclasses import replace
from pathlib import Path

import pytest
from PySide6.QtGui import QGuiApplication

from invented_ledger import invented_ledger
from spinledger.report.context import SECTIONS, ReportContext
from spinledger_app.pdf.flow import Column, Flow, add_double_rule, add_table
from spinledger_app.pdf.report import write_pdf_report
from spinledger_app.theme import LIGHT, Look


def objects(content: bytes) -> bytes:
    """Everything in a PDF, with its streams unpacked."""
    unpacked = [content]
    for packed in re.findall(rb"stream\r?\n(.*?)endstream", content, re.DOTALL):
        try:
            unpacked.append(zlib.decompress(packed))
        except zlib.error:
            continue
    return b"\n".join(unpacked)


@pytest.mark.usefixtures("qapp")
def test_pages_hold_vectors_only(tmp_path: Path) -> None:
    path = write_pdf_report(invented_ledger(), tmp_path / "a.pdf", ReportContext())
    content = objects(path.read_bytes())
    # Qt may put blank tiles for patterns; a picture would be larger than an icon.
    sizes = [
        int(w) * int(h)
        for w, h in re.findall(rb"/Width (\d+)\s*/Height (\d+)", content)
    ]
    assert all(size <= 64 * 64 for size in sizes)
    assert content.count(b"/Type /Page\n") + content.count(b"/Type /Page ") >= 2


@pytest.mark.usefixtures("qapp")
def test_sections_can_be_left_out(tmp_path: Path) -> None:
    whole = write_pdf_report(invented_ledger(), tmp_path / "a.pdf", ReportContext())
    context = ReportContext(sections=("assignment",))
    short = write_pdf_report(invented_ledger(), tmp_path / "b.pdf", context)
    assert short.stat().st_size < 0.8 * whole.stat().st_size
    assert len(SECTIONS) > 10


def test_heads_stand_again_and_the_balance_never_alone(qapp: QGuiApplication) -> None:
    flow = Flow(Look(tokens=LIGHT))
    columns = [Column(head="a", share=1), Column(head="b", share=1)]
    add_table(flow, columns, [("x", "y")] * 60)
    add_double_rule(flow)
    head = flow.blocks[0]
    pages = flow.pages()
    assert len(pages) > 1
    for page in pages:
        assert page[0][0] is head
    # Last row, the row before it and the double rule stand together.
    assert [block for block, _ in pages[-1]][-3:] == flow.blocks[-3:]
    for page in pages:
        tops = [y for _, y in page]
        assert tops == sorted(tops)


def test_a_block_that_is_taller_than_a_page_ends_the_search(
    qapp: QGuiApplication,
) -> None:
    flow = Flow(Look(tokens=LIGHT))
    flow.add(5000, lambda _ink, _y: None, keeps_next=True)
    flow.add(10, lambda _ink, _y: None)
    flow.blocks[-1] = replace(flow.blocks[-1], head=None)
    assert sum(len(page) for page in flow.pages()) == 2
