"""What the status row says of cursor, view and project."""

from __future__ import annotations

from pathlib import Path

from spinledger.project.document import Project
from spinledger_app.lanes.camera import Camera
from spinledger_app.lanes.scene import LaneScene
from spinledger_app.lanes.shift_map import ShiftMap
from spinledger_app.lanes.targets import Target
from spinledger_app.presenters.wording import chemical, number, say

# The tallest of ten thousand points of bare noise stands at 4 to 5 sd.
_QUIET_SD = 5.0


def cursor_text(scene: LaneScene | None, target: Target, ppm: float | None) -> str:
    """Shift, frequency and nearest owner under the cursor."""
    if scene is None:
        return ""
    if target.kind == "fold":
        return fold_text(scene, target.fold_ppm)
    if ppm is None:
        return ""
    parts = [
        f"δ {number(ppm, 4)} ppm",
        f"{number(ppm * scene.frequency_mhz, 2)} Hz",
    ]
    owner = _owner(scene, target, ppm)
    if owner:
        parts.append(owner)
    return "    ".join(parts)


def fold_text(scene: LaneScene, fold_ppm: tuple[float, float] | None) -> str:
    """What a fold hides: its range, and its tallest point in noise sd."""
    if fold_ppm is None:
        return ""
    low, high = fold_ppm
    height_sd = scene.measured.highest(high, low) / max(scene.noise_sd, 1e-300)
    words = (
        say("folded, {0} to {1} ppm, no line over 5 sd; click opens it")
        if height_sd <= _QUIET_SD
        else say("folded, {0} to {1} ppm, lines up to {2} sd; click opens it")
    )
    return (
        words.replace("{0}", number(high, 2))
        .replace("{1}", number(low, 2))
        .replace("{2}", number(height_sd, 0))
    )


def _owner(scene: LaneScene, target: Target, ppm: float) -> str:
    if target.kind == "root" and target.claim:
        return say("root of {0}").replace("{0}", target.claim)
    if target.kind == "branch" and target.claim:
        tree = scene.tree_of(target.claim)
        if tree is not None and 0 <= target.level < len(tree.levels):
            level = tree.levels[target.level]
            return (
                say("J({0}, {1}) {2} Hz")
                .replace("{0}", target.claim)
                .replace("{1}", level.partner)
                .replace("{2}", number(level.j_hz, 2))
            )
    if target.claim:
        return say("line of {0}").replace("{0}", target.claim)
    mark = scene.signal_at(ppm)
    if mark is None:
        return ""
    if mark.claims:
        return say("lines of {0}").replace("{0}", ", ".join(mark.claims))
    if mark.stray is not None:
        height = scene.measured.at(ppm) or 0.0
        height_sd = height / scene.noise_sd if scene.noise_sd > 0 else 0.0
        size = say("{0} sd high").replace("{0}", number(height_sd, 0))
        return f"{say('stray')}, {mark.name}, {size}"
    return say("signal, {0}").replace("{0}", mark.text)


def view_text(
    scene: LaneScene | None, camera: Camera | None, shift_map: ShiftMap | None
) -> str:
    """What part of the axis is looked at, and at which scale."""
    if scene is None or camera is None or shift_map is None:
        return say("Autosave on")
    if camera.is_at_home and shift_map.is_folded:
        hidden = scene.whole.width_ppm - sum(s.width_ppm for s in shift_map.stretches)
        return (
            say("Folded: {0} stretches, one scale, {1} ppm hidden")
            .replace("{0}", str(len(shift_map.stretches)))
            .replace("{1}", number(hidden, 1))
        )
    if camera.is_at_home:
        return say("Whole axis: {0} ppm").replace(
            "{0}", number(scene.whole.width_ppm, 1)
        )
    return (
        say("Zoom: {0} ppm, {1} px per Hz")
        .replace("{0}", number(shift_map.shown_ppm, 2))
        .replace("{1}", number(shift_map.px_per_hz(scene.frequency_mhz), 1))
    )


def source_name(project: Project) -> str | None:
    """Name of the spectrum; a bare number gets its folder's name before it."""
    name = project.source_name
    if name is not None and name.isdigit() and project.source_path is not None:
        path = Path(project.source_path)
        folder = path if path.name != name else path.parent
        return f"{folder.name}/{name}" if folder.name else name
    return name


def title(project: Project, file_name: str | None) -> str:
    """Title of the window: file, field, nucleus, solvent."""
    if project.evidence is None and project.structure is None:
        return say("No project open")
    name = file_name or source_name(project) or project.name
    if project.evidence is None:
        return name
    evidence = project.evidence
    field = round(evidence.spectrum.spectrometer_frequency_mhz)
    solvent = f", {chemical(evidence.solvent)}" if evidence.solvent else ""
    return f"{name} — {field} MHz ¹H{solvent}"
