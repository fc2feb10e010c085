"""Vector figures of the Word document: records read back by hand."""

import io
import struct
import zipfile

import pytest

from invented_ledger import invented_ledger
from spinledger.report.docx import report_docx
from spinledger.report.emf import emf_of_svg
from spinledger.report.figure import overview_svg
from spinledger.report.sketch import sketch_svg
from spinledger.report.svg_path import segments

SQUARE = (
    '<svg xmlns="http://www.w3.org/2000/svg" width="40" height="20">'
    '<path d="M1 2h10v5h-10Z" fill="#FF0000" fill-opacity="0.5"/>'
    '<text x="3" y="9" font-size="8" fill="#000000">δ 4.2</text></svg>'
)


def records(content: bytes) -> list[tuple[int, bytes]]:
    """Kind and content of every record, walked by their sizes."""
    found, at = [], 0
    while at < len(content):
        kind, size = struct.unpack_from("<II", content, at)
        assert size >= 8
        assert size % 4 == 0
        found.append((kind, content[at + 8 : at + size]))
        at += size
    assert at == len(content)
    return found


def test_header_counts_what_follows() -> None:
    content = emf_of_svg(overview_svg(invented_ledger()))
    walked = records(content)
    n_bytes, n_records, n_handles = struct.unpack_from("<IIH", content, 48)
    assert content[40:44] == b" EMF"
    assert n_bytes == len(content)
    assert n_records == len(walked)
    assert walked[0][0] == 1
    assert walked[-1][0] == 14
    made = [
        struct.unpack_from("<I", body)[0]
        for kind, body in walked
        if kind in (39, 95, 82)
    ]
    assert max(made) < n_handles


def test_shapes_keep_place_colour_and_text() -> None:
    walked = records(emf_of_svg(SQUARE))
    corners = [struct.unpack("<ii", body) for kind, body in walked if kind in (27, 54)]
    # Twentieths of a pixel.
    assert corners == [(20, 40), (220, 40), (220, 140), (20, 140)]
    brush = next(body for kind, body in walked if kind == 39)
    # Half a red on white paper: no metafile brush is half transparent.
    assert brush[8:11] == bytes([255, 128, 128])
    text = next(body for kind, body in walked if kind == 84)
    assert text[68 : 68 + 10].decode("utf-16-le") == "δ 4.2"


def test_unknown_drawings_are_refused_not_dropped() -> None:
    with pytest.raises(ValueError, match="image"):
        emf_of_svg(SQUARE.replace("</svg>", "<image/></svg>"))
    with pytest.raises(ValueError, match="'A'"):
        list(segments("M0 0A1 1 0 0 0 2 2"))


def test_relative_and_quadratic_commands_end_where_svg_says() -> None:
    parts = list(segments("M1 1q1 0 2 2H5v-1Zl1 1"))
    assert [one.kind for one in parts] == ["M", "C", "L", "L", "Z", "L"]
    # The cubic's middle equals the quadratic's: (P0 + 2 P1 + P2) / 4.
    start, (a, b, end) = parts[0].points[0], parts[1].points
    for axis, expected in enumerate(((1 + 4 + 3) / 4, (1 + 2 + 3) / 4)):
        middle = (start[axis] + 3 * a[axis] + 3 * b[axis] + end[axis]) / 8
        assert middle == pytest.approx(expected, abs=1e-12)
    # After a closed outline the pen is back at its start.
    assert parts[-1].points == ((2.0, 2.0),)


def test_word_document_holds_vector_figures_only() -> None:
    ledger = invented_ledger()
    with zipfile.ZipFile(io.BytesIO(report_docx(ledger))) as archive:
        names = [one for one in archive.namelist() if one.startswith("word/media/")]
        kinds = {one.rsplit(".", 1)[1] for one in names}
        body = archive.read("word/document.xml").decode("utf-8")
        types = archive.read("[Content_Types].xml").decode("utf-8")
        drawings = [archive.read(one) for one in names if one.endswith(".svg")]
    assert kinds == {"emf", "svg"}
    assert overview_svg(ledger).encode() in drawings
    assert sketch_svg(ledger).encode() in drawings
    assert body.count("<w:drawing") + body.count("<w:drawing ") >= len(drawings)
    assert "image/x-emf" in types
    assert "image/svg+xml" in types
    assert "Expansions" in body
