"""Hand edits: pure, recorded, and obeyed by the next ledger."""

from dataclasses import replace

import pytest

from invented_ledger import invented_fid, invented_ledger
from spinledger.errors import SideEvidenceError
from spinledger.project.constraints import (
    reconcile_options,
    standing_constraints,
    standing_proton_area,
)
from spinledger.project.document import (
    Project,
    ProjectOptions,
    open_spectrum,
    open_structure,
    with_ledger,
    with_options,
    with_sample,
)
from spinledger.project.edits import (
    Edit,
    ExcludeRegion,
    FixCoupling,
    IncludeRegion,
    MarkImpurity,
    PinClaim,
    ReleaseClaim,
    ReleaseCoupling,
    RenameLabel,
    SetIntegral,
    SetRecipe,
    SetReference,
    SwapClaims,
    UnlinkClaim,
    apply_edit,
)
from spinledger.values.recipe import Recipe, Reference

WHEN = "2026-12-01T10:00:00+01:00"


def open_project() -> Project:
    ledger = invented_ledger()
    project = open_spectrum(Project(), invented_fid(), source_path="/data/x", when=WHEN)
    project = open_structure(project, ledger.structure, when=WHEN)
    return with_ledger(project, ledger, when=WHEN)


def edited(*edits: Edit) -> Project:
    project = open_project()
    for edit in edits:
        project = apply_edit(project, edit, when=WHEN)
    return project


def pin(claim: str, low: float = 2.45, high: float = 2.53) -> PinClaim:
    return PinClaim(claim=claim, shift_ppm=(low + high) / 2, low_ppm=low, high_ppm=high)


def test_a_solved_project_is_current_until_an_edit_asks_for_more() -> None:
    project = open_project()
    assert not project.needs_ledger
    pinned = apply_edit(project, pin("2-HB"), when=WHEN)
    assert pinned.needs_ledger
    assert not project.needs_ledger  # the value before is untouched
    assert project.edits == ()
    solved = with_ledger(pinned, invented_ledger(), when=WHEN)
    assert not solved.needs_ledger
    assert solved.ledger is not None
    assert solved.ledger.edits == ("2-HB put to the signal at 2.490 ppm",)


def test_every_edit_is_in_the_audit_trail_by_hand_and_in_order() -> None:
    project = edited(pin("2-HB"), UnlinkClaim(claim="4-H"))
    by_hand = [line.what for line in project.audit if line.by_hand]
    assert by_hand == [
        "2-HB put to the signal at 2.490 ppm.",
        "4-H taken off its signal.",
    ]
    assert all(line.when == WHEN for line in project.audit)
    assert any("SHA-256 7c1e40d9" in line.what for line in project.audit)


def test_repeating_an_edit_gives_the_same_project() -> None:
    once = edited(pin("2-HB"))
    assert apply_edit(once, pin("2-HB"), when=WHEN) is once


def test_later_edits_replace_earlier_ones() -> None:
    project = edited(
        pin("2-HB"),
        pin("2-HB", 2.38, 2.45),
        UnlinkClaim(claim="4-H"),
        UnlinkClaim(claim="3-H"),
        ReleaseClaim(claim="3-H"),
        FixCoupling(claim="2-HA", partner="3-H", j_hz=4.0),
        FixCoupling(claim="3-H", partner="2-HA", j_hz=3.5),
        FixCoupling(claim="2'-H", partner="1'-H", j_hz=7.0),
        ReleaseCoupling(claim="1'-H", partner="2'-H"),
    )
    found = standing_constraints(project)
    assert [(one.claim, one.low_ppm, one.high_ppm) for one in found.pins] == [
        ("2-HB", 2.38, 2.45)
    ]
    assert found.absent == ("4-H",)
    assert [(one.claim, one.partner, one.j_hz) for one in found.fixed_couplings] == [
        ("3-H", "2-HA", 3.5)
    ]


def test_a_swap_is_one_edit_that_pins_both() -> None:
    swap = SwapClaims(first=pin("2-HA", 2.38, 2.45), second=pin("2-HB", 2.45, 2.53))
    project = edited(swap)
    assert len(project.edits) == 1
    pins = {one.claim: one.high_ppm for one in standing_constraints(project).pins}
    assert pins == {"2-HA": 2.45, "2-HB": 2.53}
    assert swap.description == "2-HA and 2-HB exchanged"


def test_regions_are_left_out_marked_and_taken_in_again() -> None:
    project = edited(
        ExcludeRegion(low_ppm=4.6, high_ppm=5.0),
        MarkImpurity(low_ppm=2.11, high_ppm=2.13, name="acetone"),
        MarkImpurity(low_ppm=1.24, high_ppm=1.28),
    )
    found = standing_constraints(project)
    assert found.excluded_ppm == ((4.6, 5.0),)
    assert [one.why for one in found.impurities] == [
        "acetone, declared by hand",
        "declared by hand",
    ]
    project = apply_edit(project, IncludeRegion(low_ppm=4.0, high_ppm=4.7), when=WHEN)
    project = apply_edit(project, IncludeRegion(low_ppm=2.12, high_ppm=2.2), when=WHEN)
    found = standing_constraints(project)
    assert found.excluded_ppm == ()
    assert [one.low_ppm for one in found.impurities] == [1.24]


@pytest.mark.parametrize("kind", [ExcludeRegion, IncludeRegion, MarkImpurity])
def test_a_region_must_have_its_ends_in_order(kind: type) -> None:
    with pytest.raises(ValueError, match=r"low_ppm must be < high_ppm, got 5\.0"):
        kind(low_ppm=5.0, high_ppm=4.6)


def test_setting_the_reference_moves_the_recipe_and_ages_the_evidence() -> None:
    project = edited(SetReference(line_ppm=7.264, to_ppm=7.26))
    assert project.recipe is not None
    step = project.recipe.find(Reference)
    assert isinstance(step, Reference)
    # -0.012 was there; 7.264 to 7.26 moves by -0.004 more.
    assert step.offset_ppm == pytest.approx(-0.016, abs=1e-12)
    assert step.by == "user"
    assert project.needs_evidence
    assert project.recipe.steps[:-1] == invented_ledger().evidence.recipe.steps[:-1]
    with pytest.raises(ValueError, match="has not been processed yet"):
        apply_edit(Project(), SetReference(line_ppm=1.0, to_ppm=2.0), when=WHEN)


def test_a_recipe_set_by_hand_and_given_back() -> None:
    recipe = invented_ledger().evidence.recipe
    shorter = Recipe(steps=recipe.steps[:-1])
    project = edited(SetRecipe(recipe=shorter, what="reference step taken out"))
    assert project.recipe == shorter
    assert project.needs_evidence
    back = apply_edit(project, SetRecipe(recipe=None, what="automatic"), when=WHEN)
    assert back.recipe is None
    assert back.evidence is None


def test_renaming_reaches_ledger_model_and_earlier_edits() -> None:
    project = edited(
        pin("2-HB"),
        FixCoupling(claim="2-HA", partner="2-HB", j_hz=-16.5),
        RenameLabel(claim="2-HB", label="2-Hb"),
    )
    ledger = project.ledger
    assert ledger is not None
    names = [entry.claim for entry in ledger.entries]
    assert "2-Hb" in names
    assert "2-HB" not in names
    partners = {one.partner for entry in ledger.entries for one in entry.couplings}
    assert "2-Hb" in partners
    assert "2-HB" not in partners
    assert ledger.model is not None
    assert "2-Hb" in {one.claim for one in ledger.model.claim_lines}
    pairs = {claim.label: claim.pair for claim in ledger.claims.claims}
    assert pairs["2-HA"] == "2-Hb"
    assert "2-Hb put to the signal" in project.edits[0].description
    # The solver still hears the labels it gives itself.
    found = standing_constraints(project)
    assert found.pins[0].claim == "2-HB"
    assert found.fixed_couplings[0].partner == "2-HB"


def test_renaming_back_forgets_the_label_and_needs_no_new_solution() -> None:
    project = edited(RenameLabel(claim="4-H", label="Me"))
    assert not project.needs_ledger
    back = apply_edit(project, RenameLabel(claim="Me", label="4-H"), when=WHEN)
    assert back.labels == ()
    assert back.ledger is not None
    assert back.ledger.entries == invented_ledger().entries


def test_renaming_after_a_solved_edit_keeps_the_ledger_current() -> None:
    project = edited(pin("2-HB"))
    solved = with_ledger(project, invented_ledger(), when=WHEN)
    renamed = apply_edit(solved, RenameLabel(claim="2-HB", label="Hb"), when=WHEN)
    assert not renamed.needs_ledger


@pytest.mark.parametrize(
    ("claim", "label", "said"),
    [
        ("4-H", "  ", "a claim needs a label"),
        ("4-H", "3-H", "'3-H' is taken by another claim"),
        ("9-H", "x", "there is no claim '9-H'"),
    ],
)
def test_impossible_labels_are_refused(claim: str, label: str, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        edited(RenameLabel(claim=claim, label=label))


def test_a_new_structure_drops_edits_of_claims_and_keeps_those_of_regions() -> None:
    project = edited(
        pin("2-HB"),
        MarkImpurity(low_ppm=2.11, high_ppm=2.13),
        RenameLabel(claim="4-H", label="Me"),
    )
    other = open_structure(project, invented_ledger().structure, when=WHEN)
    assert [type(one) for one in other.edits] == [MarkImpurity]
    assert other.labels == ()
    assert other.ledger is None
    assert other.evidence is not None


def test_verdict_before_edits_is_kept() -> None:
    project = open_project()
    assert project.verdict_before_edits is not None
    better = replace(
        invented_ledger(),
        verdict=replace(invented_ledger().verdict, probability=0.999),
    )
    pinned = apply_edit(project, pin("2-HB"), when=WHEN)
    solved = with_ledger(pinned, better, when=WHEN)
    assert solved.verdict_before_edits == invented_ledger().verdict
    assert solved.ledger is not None
    assert solved.ledger.verdict.probability == 0.999


def test_options_age_what_depends_on_them() -> None:
    project = open_project()
    assert with_options(project, ProjectOptions(), when=WHEN) is project
    quick = with_options(project, ProjectOptions(is_quick=True), when=WHEN)
    assert quick.evidence is not None
    assert quick.needs_ledger
    other = with_options(project, ProjectOptions(solvent="C6D6"), when=WHEN)
    assert other.evidence is None
    assert other.audit[-1].what == "Options set: solvent C6D6."
    assert reconcile_options(quick).quick


def test_sample_fields_change_nothing_else() -> None:
    project = open_project()
    named = with_sample(project, replace(project.sample, name="tube 7"))
    assert named.sample.name == "tube 7"
    assert not named.needs_ledger
    assert with_sample(named, named.sample) is named


def test_side_evidence_of_the_options_reaches_the_reconciliation() -> None:
    text = "carbons: 6\nCOSY: 4.19-1.23"
    options = ProjectOptions(side_text=text)
    project = with_options(open_project(), options, when=WHEN)
    assert project.needs_ledger
    assert "side evidence" in project.audit[-1].what
    side = reconcile_options(project).constraints.side
    assert side is not None
    assert (len(side.carbons), len(side.cosy)) == (6, 1)
    assert reconcile_options(open_project()).constraints.side is None
    broken = with_options(open_project(), ProjectOptions(side_text="COSY 1"), when=WHEN)
    with pytest.raises(SideEvidenceError, match="is no pair"):
        reconcile_options(broken)


def test_a_renamed_claim_is_renamed_in_the_geometry() -> None:
    project = edited(RenameLabel(claim="2-HA", label="2-H(pro-R)"))
    assert project.ledger is not None
    assert project.ledger.geometry is not None
    assert project.ledger.geometry.dihedrals[0].first == "2-H(pro-R)"


def test_the_last_integral_set_by_hand_gives_the_area_of_a_proton() -> None:
    project = open_project()
    assert project.evidence is not None
    signal = project.evidence.signals[0]
    low, high = signal.low_ppm, signal.high_ppm
    assert standing_proton_area(project) is None
    for protons in (1.0, 2.0):
        edit = SetIntegral(low_ppm=low, high_ppm=high, protons=protons)
        project = apply_edit(project, edit, when=WHEN)
    assert standing_proton_area(project) == pytest.approx(signal.area / 2)
    assert not project.needs_ledger  # a ledger has a scale of its own
    nowhere = SetIntegral(low_ppm=20.0, high_ppm=21.0, protons=1.0)
    assert standing_proton_area(apply_edit(project, nowhere, when=WHEN)) is None


def test_an_integral_counts_more_than_no_protons() -> None:
    for protons in (0.0, -1.0, float("nan"), float("inf")):
        with pytest.raises(ValueError, match="protons must be > 0"):
            SetIntegral(low_ppm=1.0, high_ppm=2.0, protons=protons)
