"""Keys that choose a tool or its setting while the cursor is on nothing."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from types import MappingProxyType

from spinledger_app.sketch import gestures
from spinledger_app.sketch.gestures import Kit, Tool

_TOOL_KEYS: Mapping[str, Tool] = MappingProxyType(
    {
        "q": Tool.PICK,
        "g": Tool.BOND,
        "w": Tool.WEDGE,
        "r": Tool.RING,
        "e": Tool.ELEMENT,
        "k": Tool.CHARGE,
        "x": Tool.ERASE,
    }
)
_ON_SOMETHING = frozenset("amt-+=#345678")


def is_typed_key(text: str) -> bool:
    """Whether a typed key means something to the editor."""
    is_known = text in _TOOL_KEYS or text in gestures.ELEMENT_KEYS
    return is_known or text in _ON_SOMETHING


def chosen_kit(kit: Kit, text: str) -> Kit | None:
    """Tool and setting that a key chooses where it is on nothing; None if none."""
    if text in _TOOL_KEYS:
        return replace(kit, tool=_TOOL_KEYS[text])
    if text == "a":
        return replace(kit, tool=Tool.RING, ring_size=6, is_aromatic=True)
    if text in ("3", "4", "5", "6", "7", "8"):
        return replace(kit, tool=Tool.RING, ring_size=int(text), is_aromatic=False)
    if text in gestures.ELEMENT_KEYS:
        return replace(kit, tool=Tool.ELEMENT, element=gestures.ELEMENT_KEYS[text])
    if text in ("+", "-"):
        return replace(kit, tool=Tool.CHARGE, charge_step=1 if text == "+" else -1)
    return None
