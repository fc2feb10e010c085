"""What the contenders panel shows."""

from __future__ import annotations

from dataclasses import dataclass

from spinledger.values.ledger import Contender, Ledger
from spinledger_app.presenters.structure import Drawing
from spinledger_app.presenters.wording import say


@dataclass(frozen=True, slots=True, kw_only=True)
class CardText:
    """One contender."""

    name: str
    smiles: str
    word: str
    stands: bool
    why: str
    tip: str


@dataclass(frozen=True, slots=True, kw_only=True)
class ContendersText:
    """The panel: heading remark, cards, or a sentence where there are none."""

    remark: str
    cards: tuple[CardText, ...]
    sentence: str = ""


def before_structure() -> ContendersText:
    """Words before there is a structure."""
    return ContendersText(
        remark="",
        cards=(),
        sentence=say(
            "Other structures that could own the same spectrum. Close isomers are "
            "listed here once a structure is drawn."
        ),
    )


def waiting() -> ContendersText:
    """Words while there is a structure but no ledger yet."""
    return ContendersText(
        remark="",
        cards=(),
        sentence=say("Close isomers are tested when the ledger is solved."),
    )


def contenders_text(ledger: Ledger, *, is_tested: bool) -> ContendersText:
    """Words of a ledger's contenders, those that stand first."""
    if not ledger.contenders:
        sentence = (
            say("No close isomer fits better than 1 in 1000.")
            if is_tested
            else say("None was tested. Refine in full tests close isomers.")
        )
        return ContendersText(remark="", cards=(), sentence=sentence)
    ordered = sorted(
        ledger.contenders, key=lambda one: (one.excluded, -(one.probability or 0.0))
    )
    standing = sum(not one.excluded for one in ordered)
    remark = (
        (say("{0} of {1} stands") if standing == 1 else say("{0} of {1} stand"))
        .replace("{0}", str(standing))
        .replace("{1}", str(len(ordered)))
    )
    return ContendersText(remark=remark, cards=tuple(_card(one) for one in ordered))


def _card(contender: Contender) -> CardText:
    word = say("excluded") if contender.excluded else say("not excluded")
    why = contender.why
    for opening in ("excluded: ", "not excluded: "):
        why = why.removeprefix(opening)
    why = why[:1].upper() + why[1:]
    probability = (
        ""
        if contender.probability is None
        else f"{say('probability')} {contender.probability:.2g}"
    )
    tip = "\n".join(
        part
        for part in (contender.name, contender.smiles, contender.why, probability)
        if part
    )
    return CardText(
        name=contender.name,
        smiles=contender.smiles,
        word=word,
        stands=not contender.excluded,
        why=why,
        tip=tip,
    )


Thumbnails = dict[str, Drawing]
