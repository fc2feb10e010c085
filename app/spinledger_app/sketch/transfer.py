"""Drawings to and from the clipboard, dropped files, and vector pictures."""

from __future__ import annotations

from pathlib import Path
from typing import Final

from PySide6.QtCore import QBuffer, QByteArray, QIODevice, QMimeData, QRect, QSize
from PySide6.QtGui import QPainter
from PySide6.QtSvg import QSvgGenerator

from spinledger.errors import StructureError
from spinledger_app.clipboard import OwnData
from spinledger_app.painting.ink import Ink
from spinledger_app.sketch.chemistry import meaning
from spinledger_app.sketch.drawing import Drawing
from spinledger_app.sketch.molfile import molblock
from spinledger_app.sketch.painting import Shown, paint_drawing
from spinledger_app.sketch.view import View
from spinledger_app.theme import Look

_READABLE: Final = (
    "chemical/x-mdl-molfile",
    "chemical/x-mdl-sdfile",
    "chemical/x-cdxml",
    "chemical/x-daylight-smiles",
    "chemical/x-inchi",
)
_ENDINGS: Final = frozenset(
    {".mol", ".mdl", ".sdf", ".sd", ".smi", ".smiles", ".inchi", ".cdxml", ".txt"}
)
_LARGEST_FILE_BYTES: Final = 2_000_000
_SVG_SCALE_PX: Final = 34.0
_SVG_MARGIN_PX: Final = 24.0


def holds_structure(data: QMimeData) -> bool:
    """Whether the data may be a structure: a known format, text, or one such file."""
    return bool(_files(data)) or data.hasText() or any(map(data.hasFormat, _READABLE))


def text_of(data: QMimeData) -> str:
    """Structure's text from clipboard or drop; empty where there is none.

    Raises
    ------
    StructureError
        If a dropped file is too large or cannot be read.
    """
    files = _files(data)
    if files:
        return _file_text(files[0])
    for name in _READABLE:
        if data.hasFormat(name):
            text = bytes(data.data(name).data()).decode("utf-8", errors="replace")
            if text.strip("\0 \r\n"):
                return text.strip("\0")
    return data.text().strip("\0") if data.hasText() else ""


def mime_data(drawing: Drawing, look: Look) -> OwnData:
    """Drawing as molfile, SMILES and vector picture.

    Plain text is the SMILES; the molfile where a fault leaves no SMILES.
    """
    data = OwnData()
    block, smiles = molblock(drawing), meaning(drawing).smiles
    data.setData("chemical/x-mdl-molfile", QByteArray(block.encode()))
    if smiles:
        data.setData("chemical/x-daylight-smiles", QByteArray(smiles.encode()))
    data.setData("image/svg+xml", QByteArray(svg(drawing, look)))
    data.setText(smiles or block)
    return data


def svg(drawing: Drawing, look: Look) -> bytes:
    """Drawing as a vector picture in the colours of a look, without a ground."""
    left, low, right, high = drawing.bounds
    scale, margin = _SVG_SCALE_PX, _SVG_MARGIN_PX
    size = QSize(
        round((right - left) * scale + 2 * margin),
        round((high - low) * scale + 2 * margin),
    )
    buffer = QBuffer()
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    generator = QSvgGenerator()
    generator.setOutputDevice(buffer)
    generator.setSize(size)
    generator.setViewBox(QRect(0, 0, size.width(), size.height()))
    generator.setTitle(meaning(drawing).smiles)
    painter = QPainter(generator)
    view = View(scale_px=scale, x_px=margin - left * scale, y_px=margin + high * scale)
    shown = Shown(drawing=drawing, hydrogens=meaning(drawing).hydrogens)
    paint_drawing(Ink(painter, look), shown, view)
    painter.end()
    buffer.close()
    return bytes(buffer.data().data())


def _files(data: QMimeData) -> list[Path]:
    if not data.hasUrls():
        return []
    paths = [Path(url.toLocalFile()) for url in data.urls() if url.isLocalFile()]
    return [path for path in paths if path.suffix.lower() in _ENDINGS]


def _file_text(path: Path) -> str:
    try:
        size = path.stat().st_size
        if size > _LARGEST_FILE_BYTES:
            raise StructureError(
                str(path), "The file is too large to be one structure."
            )
        return path.read_bytes().decode("utf-8", errors="replace")
    except OSError as error:
        raise StructureError(
            str(path), f"The file cannot be read ({error.strerror}); check the path."
        ) from error
