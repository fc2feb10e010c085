"""What the editor says about its tools, its cursor and the drawing."""

from __future__ import annotations

from spinledger_app.presenters.wording import say
from spinledger_app.sketch.chemistry import Meaning
from spinledger_app.sketch.drawing import Drawing
from spinledger_app.sketch.gestures import Kit, Spot, Tool
from spinledger_app.sketch.view import place_of


def described(drawing: Drawing, known: Meaning, spot: Spot) -> str:
    """Place of the cursor and state of the drawing in words, for screen readers."""
    place = place_of(drawing, spot)
    if place is None:
        words = say("{0} atoms, {1} bonds.")
        return words.replace("{0}", str(len(drawing.atoms))).replace(
            "{1}", str(len(drawing.bonds))
        )
    if spot.atom is not None:
        atom = drawing.atoms[spot.atom]
        faults = [one.sentence for one in known.faults if one.atom == spot.atom]
        words = say("Atom {0}, {1} bonds.").replace("{0}", atom.element)
        count = str(len(drawing.bonds_of(spot.atom)))
        return " ".join([words.replace("{1}", count), *faults])
    assert spot.bond is not None
    bond = drawing.bonds[spot.bond]
    orders = {1: say("Single"), 2: say("Double"), 3: say("Triple")}
    ends = "-".join(drawing.atoms[i].element for i in (bond.start, bond.end))
    words = say("{0} bond {1} {2}").replace("{0}", orders[bond.order])
    return words.replace("{1}", ends).replace("{2}", bond.wedge).strip()


def tool_hint(kit: Kit) -> str:
    """What a click does with a tool, in a few words."""
    hints = {
        Tool.PICK: say("Drag to move; knob turns; Ctrl+L tidies."),
        Tool.BOND: say("Click or drag; a bond again: its order."),
        Tool.WEDGE: say("Click a bond: wedge, hash, wavy."),
        Tool.RING: say("Click a place, an atom or a bond."),
        Tool.ELEMENT: say("Click an atom, or press its letter on it."),
        Tool.CHARGE: say("Click an atom, or press + or - on it."),
        Tool.ERASE: say("Click an atom or a bond to delete it."),
    }
    return hints[kit.tool]
