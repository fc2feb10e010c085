"""Colours, fonts and sizes of the bench; lengths in logical pixels."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from importlib import resources
from types import MappingProxyType
from typing import Literal

from PySide6.QtGui import QColor, QFont, QFontDatabase, QFontMetricsF, QPalette

ThemeName = Literal["light", "dark", "high contrast"]
StateName = Literal["settled", "disputed", "open", "silent", "stray"]

FAMILY = "Source Sans Pro"
_MOST_WIDTHS = 5000
_FONT_FILES = ("Regular", "It", "Semibold", "SemiboldIt")

# Okabe and Ito's colour-blind-safe palette, the same in all themes.
STATE_FILLS: Mapping[str, str] = MappingProxyType(
    {
        "settled": "#009E73",
        "disputed": "#D55E00",
        "open": "#E69F00",
        "silent": "#7F868C",
        "stray": "#CC79A7",
    }
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Tokens:
    """One theme: every colour by its role, as ``#RRGGBB``.

    ``model_fill_alpha`` and ``tint_alpha`` (0 to 255) go with ``model_fill`` and
    ``accent``; ``tones`` gives each state's colour for words and edges.
    """

    name: ThemeName
    chrome: str
    panel: str
    lane: str
    field: str
    button: str
    selected: str
    hover: str
    hairline: str
    rule: str
    edge: str
    ink: str
    muted: str
    accent: str
    on_accent: str
    trace: str
    model_edge: str
    model_fill: str
    model_fill_alpha: int
    tint_alpha: int
    bark: str
    grid: str
    band: str
    fold: str
    tones: Mapping[str, str]


LIGHT = Tokens(
    name="light",
    chrome="#ECE9E1",
    panel="#F7F5F0",
    lane="#FDFCF9",
    field="#FFFFFF",
    button="#FFFFFF",
    selected="#DCEAF3",
    hover="#EFEBE2",
    hairline="#DDD8CC",
    rule="#A8A294",
    edge="#857F70",
    ink="#1D2226",
    muted="#575D62",
    accent="#005E94",
    on_accent="#FFFFFF",
    trace="#1D2226",
    model_edge="#2F7FB3",
    model_fill="#56B4E9",
    model_fill_alpha=70,
    tint_alpha=22,
    bark="#6E6455",
    grid="#EEEAE0",
    band="#E9E6DC",
    fold="#ECE9E1",
    tones=MappingProxyType(
        {
            "settled": "#00694D",
            "disputed": "#A34700",
            "open": "#7F5600",
            "silent": "#575D62",
            "stray": "#8F3B6B",
        }
    ),
)

DARK = Tokens(
    name="dark",
    chrome="#15181B",
    panel="#1C2024",
    lane="#111416",
    field="#111416",
    button="#262B30",
    selected="#1F3645",
    hover="#262B30",
    hairline="#32383E",
    rule="#626A71",
    edge="#7A828A",
    ink="#ECE9E2",
    muted="#A6ACB1",
    accent="#6CC0EF",
    on_accent="#0B1216",
    trace="#D3D5D2",
    model_edge="#56B4E9",
    model_fill="#56B4E9",
    model_fill_alpha=64,
    tint_alpha=34,
    bark="#B3A793",
    grid="#1B1F22",
    band="#2A2F34",
    fold="#1C2024",
    tones=MappingProxyType(
        {
            "settled": "#4FCBA3",
            "disputed": "#FF9450",
            "open": "#F2B63C",
            "silent": "#A6ACB1",
            "stray": "#E6A8CA",
        }
    ),
)

HIGH_CONTRAST = Tokens(
    name="high contrast",
    chrome="#FFFFFF",
    panel="#FFFFFF",
    lane="#FFFFFF",
    field="#FFFFFF",
    button="#FFFFFF",
    selected="#CFE6F7",
    hover="#E8E8E8",
    hairline="#6B6B6B",
    rule="#000000",
    edge="#000000",
    ink="#000000",
    muted="#2B2B2B",
    accent="#003F73",
    on_accent="#FFFFFF",
    trace="#000000",
    model_edge="#00518A",
    model_fill="#56B4E9",
    model_fill_alpha=90,
    tint_alpha=40,
    bark="#3D3425",
    grid="#D0D0D0",
    band="#DDDDDD",
    fold="#E4E4E4",
    tones=MappingProxyType(
        {
            "settled": "#004D38",
            "disputed": "#7A3500",
            "open": "#5C3E00",
            "silent": "#2B2B2B",
            "stray": "#6B2A50",
        }
    ),
)

THEMES: Mapping[str, Tokens] = MappingProxyType(
    {one.name: one for one in (LIGHT, DARK, HIGH_CONTRAST)}
)


@dataclass(frozen=True, slots=True, kw_only=True)
class TextRect:
    """One painted text, for the checks of contrast, clipping and overlap."""

    owner: object
    text: str
    rect: tuple[float, float, float, float]
    room: tuple[float, float, float, float]
    colour: str


@dataclass(slots=True)
class Look:
    """Theme, text size and fonts that all widgets of one window share.

    Attributes
    ----------
    tokens : Tokens
    text_scale : float
        1.0, 1.15 or 1.30: the user's text size.
    text_log : list of TextRect or None
        Where painted texts are noted, for the checks; None to note nothing.
    """

    tokens: Tokens = LIGHT
    text_scale: float = 1.0
    reduced_motion: bool = False
    text_log: list[TextRect] | None = None
    _fonts: dict[tuple[float, int, bool], QFont] = field(default_factory=dict)
    _metrics: dict[tuple[float, int, bool], QFontMetricsF] = field(default_factory=dict)
    _widths: dict[tuple[str, float, int, bool], float] = field(default_factory=dict)
    _colours: dict[tuple[str, str], QColor] = field(default_factory=dict)
    _coloured: Tokens | None = None

    def px(self, size: float) -> int:
        """Length that grows with the user's text size, logical px."""
        return round(size * self.text_scale)

    def set_text_scale(self, text_scale: float) -> None:
        """Take another text size; fonts are made anew when next asked for."""
        self.text_scale = text_scale
        self._fonts.clear()
        self._metrics.clear()
        self._widths.clear()

    def font(self, size: float = 14, weight: int = 400, italic: bool = False) -> QFont:
        """Face of the bench at a size in px before the user's text size."""
        key = (size, weight, italic)
        if key not in self._fonts:
            font = QFont(FAMILY)
            font.setStyleHint(QFont.StyleHint.SansSerif)
            font.setPixelSize(max(1, self.px(size)))
            font.setWeight(QFont.Weight(weight))
            font.setItalic(italic)
            font.setHintingPreference(
                QFont.HintingPreference.PreferNoHinting
                if size > 15
                else QFont.HintingPreference.PreferVerticalHinting
            )
            self._fonts[key] = font
        return self._fonts[key]

    def metrics(
        self, size: float = 14, weight: int = 400, italic: bool = False
    ) -> QFontMetricsF:
        """Measures of :meth:`font`."""
        key = (size, weight, italic)
        if key not in self._metrics:
            self._metrics[key] = QFontMetricsF(self.font(size, weight, italic))
        return self._metrics[key]

    def width(
        self, text: str, size: float = 14, weight: int = 400, italic: bool = False
    ) -> float:
        """Width of a text, px; measured once."""
        key = (text, size, weight, italic)
        width = self._widths.get(key)
        if width is None:
            if len(self._widths) > _MOST_WIDTHS:
                self._widths.clear()
            width = self.metrics(size, weight, italic).horizontalAdvance(text)
            self._widths[key] = width
        return width

    def colour(self, token: str) -> QColor:
        """Colour by role: a token's name, or ``fill:`` or ``tone:`` and a state.

        A fresh copy, so that its alpha may be changed.
        """
        key = (self.tokens.name, token)
        found = self._colours.get(key)
        if found is None or self.tokens is not self._coloured:
            if self.tokens is not self._coloured:
                self._colours.clear()
                self._coloured = self.tokens
            found = self._colours[key] = self._made_colour(token)
        return QColor(found)

    def _made_colour(self, token: str) -> QColor:
        kind, _, state = token.partition(":")
        if kind == "fill":
            return QColor(STATE_FILLS[state])
        if kind == "tone":
            return QColor(self.tokens.tones[state])
        return QColor(getattr(self.tokens, token))

    @property
    def tint(self) -> QColor:
        """Accent at the strength that marks one claim in all panels."""
        colour = QColor(self.tokens.accent)
        colour.setAlpha(self.tokens.tint_alpha)
        return colour


def load_fonts() -> bool:
    """Register Source Sans with Qt; False where the font package is not installed."""
    try:
        folder = resources.files("font_source_sans_pro") / "files"
    except ModuleNotFoundError:
        return False
    loaded = [
        QFontDatabase.addApplicationFontFromData(
            (folder / f"SourceSansPro-{name}.ttf").read_bytes()
        )
        for name in _FONT_FILES
    ]
    return all(index >= 0 for index in loaded)


def palette(tokens: Tokens) -> QPalette:
    """Qt's palette in the colours of a theme."""
    roles = QPalette.ColorRole
    result = QPalette()
    for role, colour in (
        (roles.Window, tokens.panel),
        (roles.Base, tokens.field),
        (roles.AlternateBase, tokens.hover),
        (roles.Button, tokens.button),
        (roles.Mid, tokens.rule),
        (roles.Dark, tokens.edge),
        (roles.Light, tokens.field),
        (roles.Midlight, tokens.hairline),
        (roles.Shadow, tokens.edge),
        (roles.WindowText, tokens.ink),
        (roles.Text, tokens.ink),
        (roles.ButtonText, tokens.ink),
        (roles.ToolTipBase, tokens.ink),
        (roles.ToolTipText, tokens.lane),
        (roles.Highlight, tokens.accent),
        (roles.HighlightedText, tokens.on_accent),
        (roles.Link, tokens.accent),
        (roles.PlaceholderText, tokens.muted),
        (roles.Accent, tokens.accent),
    ):
        result.setColor(role, QColor(colour))
    for role in (roles.WindowText, roles.Text, roles.ButtonText):
        result.setColor(QPalette.ColorGroup.Disabled, role, QColor(tokens.muted))
    return result


def style_sheet(look: Look) -> str:
    """Rules for the ready-made widgets: menus, scroll bars, fields, tool tips."""
    t = look.tokens
    return f"""
    QMenuBar {{ background: {t.chrome}; color: {t.ink}; border: none; spacing: 0; }}
    QMenuBar::item {{ padding: 7px 10px; background: transparent; border-radius: 4px; }}
    QMenuBar::item:selected {{ background: {t.hover}; }}
    QMenu {{ background: {t.panel}; color: {t.ink}; border: 1px solid {t.edge};
             padding: 4px 0; }}
    QMenu::item {{ padding: 5px 28px 5px 28px; }}
    QMenu::item:selected {{ background: {t.selected}; }}
    QMenu::item:disabled {{ color: {t.muted}; }}
    QMenu::separator {{ height: 1px; background: {t.hairline}; margin: 4px 0; }}
    QToolTip {{ background: {t.panel}; color: {t.ink}; border: 1px solid {t.edge};
                padding: 4px 6px; }}
    QScrollArea {{ border: none; background: transparent; }}
    QScrollBar:vertical {{ background: transparent; width: 10px; margin: 0; }}
    QScrollBar:horizontal {{ background: transparent; height: 10px; margin: 0; }}
    QScrollBar::handle {{ background: {t.rule}; border-radius: 3px; margin: 2px;
                          min-height: 24px; min-width: 24px; }}
    QScrollBar::add-line, QScrollBar::sub-line {{ width: 0; height: 0; }}
    QScrollBar::add-page, QScrollBar::sub-page {{ background: transparent; }}
    QLineEdit, QPlainTextEdit, QTextBrowser, QComboBox {{
        background: {t.field}; color: {t.ink}; border: 1px solid {t.edge};
        border-radius: 4px; padding: 3px 6px;
        selection-background-color: {t.accent};
        selection-color: {t.on_accent}; }}
    QAbstractSpinBox QLineEdit {{ border: none; padding: 0; background: transparent; }}
    QTabBar::tab {{ background: {t.chrome}; color: {t.muted}; padding: 4px 12px;
                    border: none; border-bottom: 2px solid {t.chrome}; }}
    QTabBar::tab:hover {{ background: {t.hover}; }}
    QTabBar::tab:selected {{ background: {t.lane}; color: {t.ink};
                             border-bottom: 2px solid {t.accent}; }}
    QDialog {{ background: {t.panel}; }}
    """
