"""One table of everything that can be done: menu, words, keys, when, handler."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from spinledger_app.presenters.wording import say

Needs = Literal[
    "nothing",
    "spectra",
    "spectrum",
    "structure",
    "ledger",
    "claim",
    "undo",
    "redo",
    "busy",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class ActionText:
    """One entry of a menu.

    Attributes
    ----------
    name : str
        Of the handler in the window, without ``do_``.
    menu : str
    words : str
    keys : str
        Shortcuts, separated by a bar; empty for none.
    needs : str
        What has to be there for it to be enabled.
    is_checkable : bool
    ends_group : bool
        A line follows it in the menu.
    """

    name: str
    menu: str
    words: str
    keys: str = ""
    needs: Needs = "nothing"
    is_checkable: bool = False
    ends_group: bool = False


def menu_names() -> tuple[str, ...]:
    """Menus from left to right."""
    return (
        say("Project"),
        say("Edit"),
        say("View"),
        say("Process"),
        say("Claims"),
        say("Ledger"),
        say("Help"),
    )


def action_table() -> tuple[ActionText, ...]:
    """Every action in the order of the menus."""
    return (
        *_project(),
        *_edit(),
        *_view(),
        *_process(),
        *_claims(),
        *_ledger(),
        *_help(),
    )


def _project() -> tuple[ActionText, ...]:
    menu = say("Project")
    return (
        ActionText(name="new", menu=menu, words=say("New"), keys="Ctrl+N"),
        ActionText(name="open", menu=menu, words=say("Open data or project…"), keys="Ctrl+O"),
        ActionText(name="open_folder", menu=menu, words=say("Open data folder…"), keys="Ctrl+Shift+O"),
        ActionText(name="add_spectrum", menu=menu, words=say("Add spectrum…"), keys="Ctrl+D", needs="spectrum"),
        ActionText(name="add_spectrum_folder", menu=menu, words=say("Add spectrum folder…"), needs="spectrum"),
        ActionText(name="recent", menu=menu, words=say("Open recent")),
        ActionText(name="example", menu=menu, words=say("Try the example"), ends_group=True),
        ActionText(name="save", menu=menu, words=say("Save"), keys="Ctrl+S", needs="spectrum"),
        ActionText(name="save_as", menu=menu, words=say("Save as…"), keys="Ctrl+Shift+S", needs="spectrum", ends_group=True),
        ActionText(name="sample", menu=menu, words=say("Sample and batch…"), ends_group=True),
        ActionText(name="report", menu=menu, words=say("Report…"), keys="Ctrl+R", needs="ledger"),
        ActionText(name="pdf", menu=menu, words=say("Report as PDF…"), needs="ledger"),
        ActionText(name="print", menu=menu, words=say("Print report…"), keys="Ctrl+P", needs="ledger", ends_group=True),
        ActionText(name="quit", menu=menu, words=say("Quit"), keys="Ctrl+Q"),
    )  # fmt: skip


def _edit() -> tuple[ActionText, ...]:
    menu = say("Edit")
    return (
        ActionText(name="undo", menu=menu, words=say("Undo"), keys="Ctrl+Z", needs="undo"),
        ActionText(name="redo", menu=menu, words=say("Redo"), keys="Ctrl+Shift+Z|Ctrl+Y", needs="redo"),
        ActionText(name="let_go", menu=menu, words=say("Let go"), keys="Esc", needs="spectrum", ends_group=True),
        ActionText(name="paste", menu=menu, words=say("Paste structure"), keys="Ctrl+V"),
        ActionText(name="open_structure", menu=menu, words=say("Open structure file…")),
        ActionText(name="type_structure", menu=menu, words=say("Type a SMILES…"), ends_group=True),
        ActionText(name="copy_picture", menu=menu, words=say("Copy picture of the lanes"), keys="Ctrl+Shift+C", needs="spectrum"),
        ActionText(name="copy_sentence", menu=menu, words=say("Copy experimental sentence"), keys="Ctrl+E", needs="ledger"),
        ActionText(name="copy_table", menu=menu, words=say("Copy assignment table"), keys="Ctrl+T", needs="ledger"),
        ActionText(name="copy_lines", menu=menu, words=say("Copy line list"), needs="spectrum"),
        ActionText(name="copy_smiles", menu=menu, words=say("Copy structure as SMILES"), needs="structure"),
    )  # fmt: skip


def _view() -> tuple[ActionText, ...]:
    menu = say("View")
    return (
        ActionText(name="fold", menu=menu, words=say("Fold empty stretches"), keys="F", needs="spectrum", is_checkable=True),
        ActionText(name="own_gains", menu=menu, words=say("Own gain for each stretch"), keys="G", needs="spectrum", is_checkable=True),
        ActionText(name="integrals", menu=menu, words=say("Integral curves"), keys="I", needs="spectrum", is_checkable=True, ends_group=True),
        ActionText(name="home", menu=menu, words=say("All of the axis"), keys="Home", needs="spectrum"),
        ActionText(name="back", menu=menu, words=say("The view before"), keys="Backspace", needs="spectrum"),
        ActionText(name="look_at_claim", menu=menu, words=say("Look at the selected claim"), keys="L", needs="claim", ends_group=True),
        ActionText(name="next_spectrum", menu=menu, words=say("Next spectrum of the sample"), keys="T", needs="spectra"),
        ActionText(name="previous_spectrum", menu=menu, words=say("Previous spectrum of the sample"), keys="Shift+T", needs="spectra"),
        ActionText(name="ghosts", menu=menu, words=say("Other spectra behind the shown one"), keys="O", needs="spectra", is_checkable=True, ends_group=True),
        ActionText(name="theme_desktop", menu=menu, words=say("Theme as the desktop"), is_checkable=True),
        ActionText(name="theme_light", menu=menu, words=say("Light theme"), is_checkable=True),
        ActionText(name="theme_dark", menu=menu, words=say("Dark theme"), is_checkable=True),
        ActionText(name="theme_contrast", menu=menu, words=say("High contrast"), is_checkable=True, ends_group=True),
        ActionText(name="text_100", menu=menu, words=say("Text at 100 %"), keys="Ctrl+0", is_checkable=True),
        ActionText(name="text_115", menu=menu, words=say("Text at 115 %"), is_checkable=True),
        ActionText(name="text_130", menu=menu, words=say("Text at 130 %"), is_checkable=True, ends_group=True),
        ActionText(
            name="language_en", menu=menu, words=say("English"), is_checkable=True
        ),
        ActionText(
            name="language_de",
            menu=menu,
            words=say("German"),
            is_checkable=True,
            ends_group=True,
        ),
        ActionText(name="left_panels", menu=menu, words=say("Fold the left panels"), keys="F9", is_checkable=True),
        ActionText(name="default_sizes", menu=menu, words=say("Panels at their default sizes")),
    )  # fmt: skip


def _process() -> tuple[ActionText, ...]:
    menu = say("Process")
    return (
        ActionText(name="solvent", menu=menu, words=say("Solvent…"), needs="spectrum"),
        ActionText(name="phase", menu=menu, words=say("Phase by hand…"), needs="spectrum"),
        ActionText(name="window", menu=menu, words=say("Window…"), needs="spectrum"),
        ActionText(name="reference", menu=menu, words=say("Set the shift of a line…"), needs="spectrum"),
        ActionText(name="automatic", menu=menu, words=say("Process automatically again"), needs="spectrum"),
        ActionText(name="line_list", menu=menu, words=say("Line list…"), needs="spectrum", ends_group=True),
        ActionText(name="integral", menu=menu, words=say("Set the protons of a signal…"), needs="spectrum"),
        ActionText(name="exclude", menu=menu, words=say("Leave the marked region out"), keys="X", needs="spectrum"),
        ActionText(name="include", menu=menu, words=say("Take the marked region in again"), keys="Shift+X", needs="spectrum"),
        ActionText(name="impurity", menu=menu, words=say("Mark the region as an impurity…"), keys="M", needs="spectrum"),
    )  # fmt: skip


def _claims() -> tuple[ActionText, ...]:
    menu = say("Claims")
    return (
        ActionText(name="put", menu=menu, words=say("Put elsewhere"), keys="P", needs="claim"),
        ActionText(name="swap", menu=menu, words=say("Swap with its partner"), keys="S", needs="claim"),
        ActionText(name="unlink", menu=menu, words=say("Take off its signal"), keys="U", needs="claim"),
        ActionText(name="release", menu=menu, words=say("Give back to the program"), needs="claim", ends_group=True),
        ActionText(name="rename", menu=menu, words=say("Rename…"), keys="F3", needs="claim"),
        ActionText(name="type_j", menu=menu, words=say("Type J values"), keys="F2", needs="claim"),
        ActionText(name="free_j", menu=menu, words=say("Let the fit find its J again"), needs="claim"),
    )  # fmt: skip


def _ledger() -> tuple[ActionText, ...]:
    menu = say("Ledger")
    return (
        ActionText(name="refine", menu=menu, words=say("Refine"), keys="R", needs="structure"),
        ActionText(name="cancel", menu=menu, words=say("Cancel"), keys="Ctrl+.", needs="busy", ends_group=True),
        ActionText(name="what_if", menu=menu, words=say("What if the field were another…"), keys="W", needs="ledger"),
        ActionText(name="no_overlay", menu=menu, words=say("Take the overlay away"), needs="spectrum", ends_group=True),
        ActionText(name="add_contender", menu=menu, words=say("Add a contender…"), needs="structure"),
        ActionText(name="n_contenders", menu=menu, words=say("Number of isomers to test…"), needs="structure", ends_group=True),
        ActionText(name="side_evidence", menu=menu, words=say("Side evidence…"), needs="structure"),
        ActionText(name="published_list", menu=menu, words=say("Compare with a published list…"), needs="ledger", ends_group=True),
        ActionText(name="next_claim", menu=menu, words=say("Next claim"), keys="N", needs="ledger"),
        ActionText(name="previous_claim", menu=menu, words=say("Previous claim"), keys="B", needs="ledger"),
    )  # fmt: skip


def _help() -> tuple[ActionText, ...]:
    menu = say("Help")
    return (
        ActionText(name="keys", menu=menu, words=say("Keys and gestures"), keys="F1"),
        ActionText(name="about", menu=menu, words=say("About Spin Ledger")),
    )  # fmt: skip
