"""Vector figures in a Word document: SVG, with an enhanced metafile for older Word."""

from __future__ import annotations

import re
from typing import Any

from docx.enum.text import WD_ALIGN_PARAGRAPH
from docx.opc.constants import RELATIONSHIP_TYPE
from docx.opc.packuri import PackURI
from docx.opc.part import Part
from docx.oxml import parse_xml
from docx.shared import Mm

from spinledger.report.emf import emf_of_svg

_EMU_PER_PX = 9525
_SIZE = re.compile(r'<svg [^>]*?width="([\d.]+)" height="([\d.]+)"')
_TITLE = re.compile(r"<title>(.*?)</title>", re.DOTALL)


def add_figure(
    document: Any, svg: str, *, width_mm: float | None = None, where: Any = None
) -> None:
    """Append a drawing in a paragraph of its own.

    Parameters
    ----------
    document : docx.document.Document
    svg : str
        Drawing of this program.
    width_mm : float, optional
        As printed; the drawing's own size if not given.
    where : docx.text.paragraph.Paragraph, optional
        Paragraph to use instead of a new one at the end.
    """
    wide, high = (float(one) for one in _size(svg))
    across = round(wide * _EMU_PER_PX) if width_mm is None else int(Mm(width_mm))
    upright = round(across * high / wide)
    number = sum(1 for _ in document.part.package.iter_parts())
    metafile = _related(document, f"figure{number}.emf", "image/x-emf", emf_of_svg(svg))
    drawing = _related(
        document, f"figure{number}.svg", "image/svg+xml", svg.encode("utf-8")
    )
    found = _TITLE.search(svg)
    words = found[1].replace('"', "&quot;") if found else "Figure"
    paragraph = document.add_paragraph() if where is None else where
    paragraph.alignment = WD_ALIGN_PARAGRAPH.LEFT
    paragraph.add_run()._r.append(
        parse_xml(_markup((across, upright), (metafile, drawing), number, words))
    )


def _size(svg: str) -> tuple[str, str]:
    found = _SIZE.search(svg)
    if found is None:
        raise ValueError("svg: the drawing does not say its width and height")
    return found[1], found[2]


def _related(document: Any, name: str, content_type: str, content: bytes) -> str:
    """Put a part into the document; gives the name of its relation."""
    part = Part(
        PackURI(f"/word/media/{name}"), content_type, content, document.part.package
    )
    relation: str = document.part.relate_to(part, RELATIONSHIP_TYPE.IMAGE)
    return relation


def _markup(
    size: tuple[int, int], names: tuple[str, str], number: int, words: str
) -> str:
    """Inline picture: Word since 2016 shows the SVG, all others the metafile."""
    across, upright = size
    metafile, drawing = names
    place = "http://schemas.openxmlformats.org"
    return (
        f'<w:drawing xmlns:w="{place}/wordprocessingml/2006/main"'
        f' xmlns:wp="{place}/drawingml/2006/wordprocessingDrawing"'
        f' xmlns:a="{place}/drawingml/2006/main"'
        f' xmlns:pic="{place}/drawingml/2006/picture"'
        f' xmlns:r="{place}/officeDocument/2006/relationships">'
        '<wp:inline distT="0" distB="0" distL="0" distR="0">'
        f'<wp:extent cx="{across}" cy="{upright}"/>'
        f'<wp:docPr id="{number}" name="Figure {number}" descr="{words}"/>'
        f'<a:graphic><a:graphicData uri="{place}/drawingml/2006/picture">'
        f'<pic:pic><pic:nvPicPr><pic:cNvPr id="{number}" name="Figure {number}"/>'
        "<pic:cNvPicPr/></pic:nvPicPr><pic:blipFill>"
        f'<a:blip r:embed="{metafile}"><a:extLst>'
        '<a:ext uri="{96DAC541-7B7A-43D3-8B79-37D633B846F1}">'
        '<asvg:svgBlip xmlns:asvg="http://schemas.microsoft.com/office/drawing/2016/SVG/main"'
        f' r:embed="{drawing}"/></a:ext></a:extLst></a:blip>'
        "<a:stretch><a:fillRect/></a:stretch></pic:blipFill><pic:spPr>"
        f'<a:xfrm><a:off x="0" y="0"/><a:ext cx="{across}" cy="{upright}"/></a:xfrm>'
        '<a:prstGeom prst="rect"><a:avLst/></a:prstGeom></pic:spPr></pic:pic>'
        "</a:graphicData></a:graphic></wp:inline></w:drawing>"
    )
