from dataclasses import replace

import pytest

from invented_ledger import overlapped_ledger
from spinledger.errors import StructureError
from spinledger.sample.mixture import (
    Component,
    check_components,
    mixture_of,
    stereo_kind,
)
from spinledger.structure.read import read_structure
from spinledger.values.ledger import Entry, EntryGroup, Ledger

ANTI, SYN = "C[C@@H](O)[C@@H](C)C(=O)OCC", "C[C@@H](O)[C@H](C)C(=O)OCC"


def component(name: str, smiles: str, part: str = "product") -> Component:
    return Component(name=name, structure=read_structure(smiles), part=part)  # type: ignore[arg-type]  # test data


def entry(label: str, protons: int, area: float, *shared: str) -> Entry:
    return Entry(
        claim=label, atoms=(0,), species=0, protons=protons, state="settled",
        predicted_shift_ppm=1.0, predicted_shift_sd_ppm=0.1, shift_ppm=1.0,
        integral_protons=area, integral_sd_protons=0.01, range_ppm=None,
        group=EntryGroup(kind="shared", partners=shared) if shared else None,
    )  # fmt: skip


def ledger_with(*entries: Entry) -> Ledger:
    return replace(overlapped_ledger(), entries=entries)


def test_ratio_comes_from_signals_that_stand_alone() -> None:
    ledger = ledger_with(
        entry("3-H", 1, 0.75),
        entry("4-H", 3, 9.0, "4-H (2)"),
        entry("3-H (2)", 1, 0.25),
        entry("4-H (2)", 3, 9.0, "4-H"),
    )
    found = mixture_of(ledger, [component("anti", ANTI), component("syn", SYN)])
    assert [one.by_integral for one in found.amounts] == [True, True]
    assert found.amounts[0].mol_percent == pytest.approx(75.0)
    (dr,) = found.ratios
    assert dr.kind == "dr"
    assert dr.percent == pytest.approx(75.0)
    # By hand: each amount is sure to 3 % and 0.01, added as relative errors.
    relative = [
        (0.0225**2 + 0.01**2) ** 0.5 / 0.75,
        (0.0075**2 + 0.01**2) ** 0.5 / 0.25,
    ]
    by_hand = 100.0 * 0.75 * 0.25 * (relative[0] ** 2 + relative[1] ** 2) ** 0.5
    assert dr.sd == pytest.approx(by_hand)


def test_amount_from_an_overlap_is_said_to_be_from_the_fit() -> None:
    ledger = ledger_with(
        entry("4-H", 3, 2.4, "4-H (2)"), entry("4-H (2)", 3, 0.6, "4-H")
    )
    found = mixture_of(ledger, [component("anti", ANTI), component("syn", SYN)])
    assert [one.by_integral for one in found.amounts] == [False, False]
    assert found.amounts[1].mol_percent == pytest.approx(20.0)
    assert any("from the line-shape fit" in one for one in found.sentences())


def test_conversion_counts_products_against_starting_material() -> None:
    ledger = ledger_with(entry("1-H", 1, 0.2), entry("1-H (2)", 3, 2.4))
    parts = [
        component("ketone", "CC(=O)CC(=O)OCC", "starting material"),
        component("alcohol", "CC(O)CC(=O)OCC"),
    ]
    (conversion,) = mixture_of(ledger, parts).ratios
    assert conversion.kind == "conversion"
    assert conversion.percent == pytest.approx(80.0)


def test_component_that_is_not_there_gets_a_limit() -> None:
    ledger = ledger_with(entry("1-H", 1, 1.0))
    parts = [component("alcohol", "CC(O)CC(=O)OCC"), component("ketone", "CC(C)=O")]
    found = mixture_of(ledger, parts)
    assert found.amounts[1].claims == ()
    assert any("ketone was not found (less than" in one for one in found.sentences())


@pytest.mark.parametrize(
    ("one", "other", "kind"),
    [
        (ANTI, SYN, "dr"),
        (r"C/C=C/C(=O)O", r"C/C=C\C(=O)O", "E/Z"),
        ("CCO", "CCCO", None),
    ],
)
def test_kind_of_a_stereochemical_ratio(one: str, other: str, kind: str | None) -> None:
    assert stereo_kind(read_structure(one), read_structure(other)) == kind


def test_unsure_assignment_is_said_beside_the_amounts() -> None:
    plain = ledger_with(entry("3-H", 1, 0.75), entry("3-H (2)", 1, 0.25))
    doubtful = replace(plain, verdict=replace(plain.verdict, state="not reconciled"))
    found = mixture_of(doubtful, [component("anti", ANTI), component("syn", SYN)])
    assert any("only as far as the assignment" in one for one in found.sentences())


def test_mirror_images_and_twins_are_refused_in_a_sentence() -> None:
    right, left = "C[C@@H](O)CC(=O)OCC", "C[C@H](O)CC(=O)OCC"
    with pytest.raises(StructureError, match="mirror image of R"):
        check_components([component("R", right), component("S", left)])
    with pytest.raises(StructureError, match="same compound as R"):
        check_components([component("R", right), component("R again", right)])
