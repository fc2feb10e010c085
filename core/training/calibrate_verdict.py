"""Fit the verdict model on acquired spectra of known compounds and wrong structures.

usage: calibrate_verdict.py ROWS.json [--out verdict.json] [--diagram FILE.svg]
       [--ablation] [--verbose]

ROWS.json is what tests/benchmarks/reconcile.py wrote with --rows: for every
spectrum the features of the true structure, of wrong isomers and of structures
of other compounds. A logistic model with weights that may only count against a
structure is fitted with equal weight for right and wrong; every figure printed
is of spectra whose compound took no part in the fit.
"""

from __future__ import annotations

import argparse
import json
from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.optimize import minimize

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

FEATURES = (
    "misfit",
    "worst_misfit",
    "shift",
    "worst_shift",
    "rigid_coupling",
    "worst_rigid_coupling",
    "soft_coupling",
    "amplitude",
    "width",
    "open",
    "unexplained",
    "coincidence",
)
# Where the data say little a weight stays near these. A worst residual is a
# negative log likelihood, of which half is believed since residuals have heavier
# tails than a Gaussian; means are shared with them.
PRIOR_WEIGHTS = {
    "misfit": 1.0,
    "worst_misfit": 1.0,
    "shift": 0.3,
    "worst_shift": 0.4,
    "rigid_coupling": 0.3,
    "worst_rigid_coupling": 0.4,
    "soft_coupling": 0.2,
    "amplitude": 0.3,
    "width": 0.3,
    "open": 5.0,
    "unexplained": 3.0,
    "coincidence": 0.5,
}
RIDGE = 0.05
# Parts of the evidence, each added to those before it in an ablation.
PARTS = {
    "shift": ("shift", "worst_shift"),
    "+ integral": ("amplitude", "open", "unexplained"),
    "+ splitting": (
        "rigid_coupling",
        "worst_rigid_coupling",
        "soft_coupling",
        "coincidence",
    ),
    "+ line shape": ("misfit", "worst_misfit", "width"),
}
# Of the weight of all wrong structures; the rest are wrong isomers.
CROSS_WEIGHT = 0.25
# A wrong structure accepted costs this many times a right one refused.
WRONG_ACCEPTED_COST = 3.0
LEAST_ACCEPTED = 0.9


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Table:
    """One row a structure.

    Attributes
    ----------
    features : numpy.ndarray, shape (n, n_features)
    is_right, is_isomer, is_tie : numpy.ndarray of bool, shape (n,)
    spectra, compounds : tuple of str
    """

    features: FloatArray
    is_right: BoolArray
    is_isomer: BoolArray
    is_tie: BoolArray
    spectra: tuple[str, ...]
    compounds: tuple[str, ...]


def read_rows(path: Path) -> Table:
    """Rows of the benchmark as arrays; negative controls count as wrong."""
    features, right, isomer, tie = [], [], [], []
    spectra: list[str] = []
    compounds: list[str] = []

    def add(
        row: dict[str, Any], spectrum: dict[str, Any], marks: tuple[bool, bool, bool]
    ) -> None:
        if not row.get("faults"):
            return
        features.append([row["faults"][name] for name in FEATURES])
        right.append(marks[0])
        isomer.append(marks[1])
        tie.append(marks[2])
        spectra.append(spectrum["name"])
        compounds.append(plain(spectrum["smiles"]))

    for spectrum in json.loads(path.read_text()):
        if "true" not in spectrum or spectrum["mixture"]:
            continue
        is_negative = spectrum["name"].startswith("neg_")
        add(spectrum["true"], spectrum, (not is_negative, is_negative, False))
        for row in spectrum["decoys"]:
            add(row, spectrum, (False, True, row["tie"]))
        for row in spectrum["cross"]:
            add(row, spectrum, (False, False, False))
    return Table(
        features=np.array(features),
        is_right=np.array(right),
        is_isomer=np.array(isomer),
        is_tie=np.array(tie),
        spectra=tuple(spectra),
        compounds=tuple(compounds),
    )


def plain(smiles: str) -> str:
    """SMILES without stereo marks, so that mirror images are one compound."""
    return "".join(letter for letter in smiles if letter not in "@/\\")


def sample_weights(table: Table, used: BoolArray) -> FloatArray:
    """Equal weight for right and wrong; each compound counts once among the right."""
    weights = np.zeros(used.size)
    right = table.is_right & used
    isomer = ~table.is_right & table.is_isomer & ~table.is_tie & used
    cross = ~table.is_right & ~table.is_isomer & used
    names = np.array(table.compounds)
    for rows, total in (
        (right, 0.5),
        (isomer, 0.5 * (1 - CROSS_WEIGHT)),
        (cross, 0.5 * CROSS_WEIGHT),
    ):
        if rows.any():
            counts = {
                name: int((names[rows] == name).sum()) for name in set(names[rows])
            }
            share = np.array([1.0 / np.sqrt(counts[name]) for name in names[rows]])
            weights[rows] = total * share / share.sum()
    return np.asarray(weights / weights.sum())


def fit(features: FloatArray, is_right: BoolArray, weights: FloatArray) -> FloatArray:
    """Intercept and weights (>= 0) of the logistic model."""
    scale = np.maximum(features.std(axis=0), 1e-6)
    z = features / scale
    centre = np.array([PRIOR_WEIGHTS[name] for name in FEATURES]) * scale
    n = z.shape[1]

    def loss(parameters: FloatArray) -> tuple[float, FloatArray]:
        logits = parameters[0] - z @ parameters[1:]
        signs = np.where(is_right, 1.0, -1.0)
        margins = signs * logits
        value = float((weights * np.logaddexp(0.0, -margins)).sum())
        slope = -weights * signs / (1.0 + np.exp(np.clip(margins, -500, 500)))
        gradient = np.concatenate([[slope.sum()], -(z.T @ slope)])
        off = parameters[1:] - centre
        value += 0.5 * RIDGE * float(off @ off)
        gradient[1:] += RIDGE * off
        return value, gradient

    start = np.concatenate([[2.0], np.full(n, 0.3)])
    bounds = [(None, None), *[(0.0, None)] * n]
    found = minimize(loss, start, jac=True, bounds=bounds, method="L-BFGS-B")
    return np.concatenate([[found.x[0]], found.x[1:] / scale])


def left_out_logits(table: Table) -> FloatArray:
    """Logit of every row from a fit that did not see its compound."""
    names = np.array(table.compounds)
    logits = np.zeros(names.size)
    for name in sorted(set(table.compounds)):
        test = names == name
        parameters = _fit_rows(table, ~test)
        logits[test] = parameters[0] - table.features[test] @ parameters[1:]
    return logits


def _fit_rows(table: Table, used: BoolArray) -> FloatArray:
    weights = sample_weights(table, used)
    kept = weights > 0
    return fit(table.features[kept], table.is_right[kept], weights[kept])


def choose_limits(probabilities: FloatArray, table: Table) -> tuple[float, float]:
    """Upper and lower limit of the verdict from left-out probabilities.

    The upper one makes wrongly accepted structures, at their higher cost, and
    refused right ones cheapest while at least 90 % of the right pass, where
    that can be had; below the lower one hardly any right structure lies.
    """
    right = probabilities[table.is_right]
    wrong = probabilities[~table.is_right & ~table.is_tie]
    best, upper = np.inf, 0.5
    for limit in np.arange(0.3, 0.91, 0.01):
        accepted = float((right >= limit).mean())
        cost = WRONG_ACCEPTED_COST * float((wrong >= limit).mean()) + 1.0 - accepted
        cost += 10.0 * max(LEAST_ACCEPTED - accepted, 0.0)
        if cost < best - 1e-9:
            best, upper = cost, float(limit)
    lower = float(min(np.quantile(right, 0.03), upper - 0.1, 0.35))
    return round(upper, 2), round(max(lower, 0.05), 2)


def choose_temperature(logits: FloatArray, table: Table) -> float:
    """Temperature that makes shares among the candidates of a spectrum likeliest."""
    names = np.array(table.spectra)
    sets = [
        rows
        for name in sorted(set(table.spectra))
        if table.is_right[
            rows := np.flatnonzero((names == name) & (table.is_right | table.is_isomer))
        ].any()
        and rows.size > 1
    ]

    def cost(temperature: float) -> float:
        total = 0.0
        for rows in sets:
            scaled = logits[rows] / temperature
            scaled -= np.logaddexp.reduce(scaled)
            total -= float(scaled[table.is_right[rows]].max())
        return total

    grid = np.exp(np.linspace(np.log(0.25), np.log(4.0), 33))
    return round(float(grid[int(np.argmin([cost(t) for t in grid]))]), 2)


def reliability(probabilities: FloatArray, table: Table) -> list[dict[str, float]]:
    """Share of right structures by stated probability, at a prior of one half."""
    used = np.ones(probabilities.size, dtype=np.bool_)
    weights = sample_weights(table, used)
    rows = []
    edges = np.array([0.0, 0.1, 0.3, 0.5, 0.7, 0.9, 1.0 + 1e-9])
    for low, high in pairwise(edges):
        inside = (probabilities >= low) & (probabilities < high) & (weights > 0)
        if inside.any():
            total = float(weights[inside].sum())
            rows.append(
                {
                    "stated": round(
                        float((weights * probabilities)[inside].sum()) / total, 3
                    ),
                    "seen": round(
                        float(weights[inside & table.is_right].sum()) / total, 3
                    ),
                    "structures": int(inside.sum()),
                }
            )
    return rows


def diagram(rows: list[dict[str, float]]) -> str:
    """SVG of seen against stated probability; areas of dots are structures."""
    size, edge = 360, 56
    span = size - 2 * edge

    def at(stated: float, seen: float) -> tuple[float, float]:
        return edge + span * stated, size - edge - span * seen

    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {size} {size}" '
        'font-family="sans-serif" font-size="11" fill="none">',
        f'<rect width="{size}" height="{size}" fill="white"/>',
        f'<rect x="{edge}" y="{edge}" width="{span}" height="{span}" stroke="#888"/>',
    ]
    for tick in (0.0, 0.25, 0.5, 0.75, 1.0):
        x, y = at(tick, tick)
        parts.append(
            f'<text x="{x:.0f}" y="{size - edge + 16}" text-anchor="middle" '
            f'fill="#333">{tick:g}</text>'
            f'<text x="{edge - 6}" y="{y + 4:.0f}" text-anchor="end" '
            f'fill="#333">{tick:g}</text>'
        )
    (x0, y0), (x1, y1) = at(0.0, 0.0), at(1.0, 1.0)
    parts.append(f'<path d="M{x0} {y0}L{x1} {y1}" stroke="#888" stroke-dasharray="4"/>')
    dots = [at(row["stated"], row["seen"]) for row in rows]
    line = "L".join(f"{x:.1f} {y:.1f}" for x, y in dots)
    parts.append(f'<path d="M{line}" stroke="#20558a"/>')
    for (x, y), row in zip(dots, rows, strict=True):
        radius = 2.0 + 0.5 * float(np.sqrt(row["structures"]))
        parts.append(
            f'<circle cx="{x:.1f}" cy="{y:.1f}" r="{radius:.1f}" fill="#20558a">'
            f"<title>{row['structures']} structures</title></circle>"
        )
    parts += [
        f'<text x="{size / 2}" y="{size - 16}" text-anchor="middle" fill="#333">'
        "stated probability</text>",
        f'<text transform="translate(16 {size / 2})rotate(-90)" text-anchor="middle" '
        'fill="#333">share of right structures</text>',
        f'<text x="{size / 2}" y="28" text-anchor="middle" fill="#333">'
        "Verdict, compounds left out of the fit</text>",
        "</svg>",
    ]
    return "\n".join(parts) + "\n"


def figures(probabilities: FloatArray, table: Table, upper: float) -> dict[str, Any]:
    """Left-out figures of merit."""
    right = table.is_right
    isomer = ~right & table.is_isomer & ~table.is_tie
    cross = ~right & ~table.is_isomer
    wrong = probabilities[isomer]
    auc = float((probabilities[right][:, None] > wrong[None, :]).mean())
    counted = right | isomer
    brier = float(np.square(right[counted] - probabilities[counted]).mean())
    return {
        "true_structures": int(right.sum()),
        "accepted": round(float((probabilities[right] >= upper).mean()), 3),
        "wrong_isomers": int(isomer.sum()),
        "isomers_refused": round(float((wrong < upper).mean()), 3),
        "cross_structures": int(cross.sum()),
        "cross_accepted": round(float((probabilities[cross] >= upper).mean()), 4)
        if cross.any()
        else None,
        "auc": round(auc, 3),
        "brier": round(brier, 3),
    }


def ablation(table: Table) -> list[dict[str, Any]]:
    """Left-out figures as parts of the evidence are added one by one.

    The fits behind the features used all of the spectrum; what is left out here
    is left out of the verdict alone.
    """
    rows, kept = [], np.zeros(len(FEATURES), dtype=np.bool_)
    for part, names in PARTS.items():
        kept |= np.isin(FEATURES, names)
        reduced = replace(table, features=np.where(kept, table.features, 0.0))
        logits = left_out_logits(reduced)
        probabilities = 1.0 / (1.0 + np.exp(-np.clip(logits, -30, 30)))
        upper, _ = choose_limits(probabilities, reduced)
        first, sets = ranked_first(logits, table)
        found = figures(probabilities, reduced, upper)
        rows.append({"part": part, "first": first, "sets": sets, **found})
    return rows


def ranked_first(logits: FloatArray, table: Table) -> tuple[int, int]:
    """Spectra whose right structure beats all wrong isomers, and how many there are."""
    names = np.array(table.spectra)
    first, sets = 0, 0
    for name in sorted(set(table.spectra)):
        here = names == name
        right = logits[here & table.is_right]
        wrong = logits[here & table.is_isomer & ~table.is_right & ~table.is_tie]
        if right.size and wrong.size:
            sets += 1
            first += int(right.max() > wrong.max())
    return first, sets


def main() -> int:
    """Fit, print the left-out figures, and write the model."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("rows", type=Path)
    parser.add_argument("--out", type=Path)
    parser.add_argument("--diagram", type=Path)
    parser.add_argument("--ablation", action="store_true")
    parser.add_argument("--verbose", action="store_true")
    args = parser.parse_args()
    table = read_rows(args.rows)
    logits = left_out_logits(table)
    probabilities = 1.0 / (1.0 + np.exp(-np.clip(logits, -30, 30)))
    upper, lower = choose_limits(probabilities, table)
    parameters = _fit_rows(table, np.ones(logits.size, dtype=np.bool_))
    left_out = figures(probabilities, table, upper)
    believed = reliability(probabilities, table)
    model = {
        "features": list(FEATURES),
        "weights": {
            name: round(float(w), 5)
            for name, w in zip(FEATURES, parameters[1:], strict=True)
        },
        "intercept": round(float(parameters[0]), 5),
        "upper": upper,
        "lower": lower,
        "temperature": choose_temperature(logits, table),
        "left_out_by_compound": left_out,
        "reliability": believed,
    }
    print(json.dumps(model, indent=1))
    if args.ablation:
        print(json.dumps(ablation(table), indent=1))
    if args.verbose:
        _print_mistakes(table, probabilities, upper)
    if args.out:
        args.out.write_text(json.dumps(model, indent=1) + "\n")
    if args.diagram:
        args.diagram.write_text(diagram(believed))
    return 0


def _print_mistakes(table: Table, probabilities: FloatArray, upper: float) -> None:
    for row, probability in enumerate(probabilities):
        if table.is_tie[row] or table.is_right[row] == (probability >= upper):
            continue
        faults = dict(zip(FEATURES, table.features[row].round(2), strict=True))
        kind = (
            "right"
            if table.is_right[row]
            else "isomer"
            if table.is_isomer[row]
            else "cross"
        )
        print(f"{table.spectra[row]:40s} {kind:6s} {probability:.2f} {faults}")


if __name__ == "__main__":
    raise SystemExit(main())
