"""What the program remembers between runs; nothing of a project."""

from __future__ import annotations

from PySide6.QtCore import QByteArray, QSettings

_MOST_RECENT = 8


class BenchSettings:
    """Typed access to the stored settings.

    Parameters
    ----------
    store : QSettings
    """

    def __init__(self, store: QSettings) -> None:
        self._store = store

    @property
    def theme(self) -> str:
        """light, dark, high contrast, or desktop for what the desktop says."""
        return str(self._store.value("theme", "desktop", type=str))

    @theme.setter
    def theme(self, name: str) -> None:
        self._store.setValue("theme", name)

    @property
    def text_scale(self) -> float:
        """1.0, 1.15 or 1.3."""
        value = self._store.value("text_scale", 1.0, type=float)
        return float(value) if value in (1.0, 1.15, 1.3) else 1.0

    @text_scale.setter
    def text_scale(self, scale: float) -> None:
        self._store.setValue("text_scale", scale)

    @property
    def folds_when_solved(self) -> bool:
        """Whether the axis folds once there is a ledger: so unless chosen otherwise."""
        return bool(self._store.value("folds_when_solved", True, type=bool))

    @folds_when_solved.setter
    def folds_when_solved(self, is_folded: bool) -> None:
        self._store.setValue("folds_when_solved", is_folded)

    @property
    def shows_integrals(self) -> bool:
        """Whether integral curves show on the continuous axis."""
        return bool(self._store.value("shows_integrals", True, type=bool))

    @shows_integrals.setter
    def shows_integrals(self, is_shown: bool) -> None:
        self._store.setValue("shows_integrals", is_shown)

    @property
    def language(self) -> str:
        """en, de, or empty for the desktop's."""
        return str(self._store.value("language", "", type=str))

    @language.setter
    def language(self, code: str) -> None:
        self._store.setValue("language", code)

    @property
    def recent(self) -> list[str]:
        """Places of data and projects that were opened last, newest first."""
        text = str(self._store.value("recent", "", type=str))
        return [line for line in text.split("\n") if line]

    def add_recent(self, place: str) -> None:
        """Put a place at the head of the recent ones."""
        places = [place, *(one for one in self.recent if one != place)]
        self._store.setValue("recent", "\n".join(places[:_MOST_RECENT]))

    @property
    def last_folder(self) -> str:
        """Folder in which the last file was chosen."""
        return str(self._store.value("last_folder", "", type=str))

    @last_folder.setter
    def last_folder(self, folder: str) -> None:
        self._store.setValue("last_folder", folder)

    def geometry(self, name: str) -> QByteArray | None:
        """Stored geometry or splitter state; None where there is none."""
        value = self._store.value(f"geometry/{name}", None)
        return value if isinstance(value, QByteArray) else None

    def set_geometry(self, name: str, state: QByteArray) -> None:
        """Store a geometry or splitter state."""
        self._store.setValue(f"geometry/{name}", state)

    @property
    def shows_ghosts(self) -> bool:
        """Whether the sample's other spectra are drawn behind the shown one."""
        return bool(self._store.value("shows_ghosts", False, type=bool))

    @shows_ghosts.setter
    def shows_ghosts(self, is_shown: bool) -> None:
        self._store.setValue("shows_ghosts", is_shown)

    @property
    def folds_left(self) -> bool:
        """Whether the left panels are folded to a rail."""
        return bool(self._store.value("folds_left", False, type=bool))

    @folds_left.setter
    def folds_left(self, is_folded: bool) -> None:
        self._store.setValue("folds_left", is_folded)

    @property
    def panel_sizes(self) -> tuple[list[int], list[int]] | None:
        """Widths of the panels and heights at the left; None for the default."""
        text = str(self._store.value("panel_sizes", "", type=str))
        across, _, down = text.partition("/")
        try:
            sizes = [int(one) for one in across.split()], [int(x) for x in down.split()]
        except ValueError:
            return None
        if (len(sizes[0]), len(sizes[1])) != (3, 2) or min(sizes[0] + sizes[1]) < 0:
            return None
        return sizes

    @panel_sizes.setter
    def panel_sizes(self, sizes: tuple[list[int], list[int]] | None) -> None:
        text = ""
        if sizes is not None:
            text = "/".join(" ".join(map(str, one)) for one in sizes)
        self._store.setValue("panel_sizes", text)

    @property
    def lane_shares(self) -> tuple[float, float, float] | None:
        """Heights of the lanes as shares; None for the default."""
        text = str(self._store.value("lane_shares", "", type=str))
        parts = text.split()
        try:
            values = [float(part) for part in parts]
        except ValueError:
            return None
        if len(values) != 3 or min(values) <= 0:
            return None
        return values[0], values[1], values[2]

    @lane_shares.setter
    def lane_shares(self, shares: tuple[float, float, float]) -> None:
        self._store.setValue("lane_shares", " ".join(f"{one:.4f}" for one in shares))
