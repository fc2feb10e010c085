"""Reconcile acquired spectra in one process and compare with what is published.

usage: reconcile.py ACQUIRED [--decoys FILE] [--cross N] [--only NAME ...] [--skip NAME ...]
                    [--cache FOLDER] [--rows FILE]

For every spectrum: protons placed and J errors of the true structure (counted as
shared/measure/score.py counts), and the verdict's features, own probability and
seconds of the true structure, of its decoys and of N structures of other
compounds. Evidence is kept in the cache folder between runs. Prints one JSON
object with the totals; rows go to the file.
"""

from __future__ import annotations

import argparse
import importlib.util
import json
import pickle
import random
import statistics
import sys
import time
from pathlib import Path
from types import ModuleType
from typing import Any

from spinledger.detection.evidence import gather_evidence
from spinledger.errors import SpinLedgerError
from spinledger.io.read import read_acquired
from spinledger.reconcile.evaluate import Bench, Evaluation, evaluate, lay_out
from spinledger.reconcile.options import ReconcileOptions
from spinledger.reconcile.ranking import limits_of
from spinledger.reconcile.run import ledger_of
from spinledger.report.json_ledger import ledger_to_json
from spinledger.structure.read import read_structure
from spinledger.values.evidence import Evidence


def score_module(acquired: Path) -> ModuleType:
    """The scoring script beside the acquired data."""
    path = acquired.parent / "measure" / "score.py"
    spec = importlib.util.spec_from_file_location("score", path)
    if spec is None or spec.loader is None:
        raise SystemExit(f"no scoring script at {path}")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def evidence_of(
    folder: Path, truth: dict[str, Any], score: ModuleType, cache: Path | None
) -> Evidence:
    """Evidence of one acquired folder, from the cache where it is there."""
    kept = cache / f"{folder.name}.pkl" if cache else None
    if kept is not None and kept.exists():
        with kept.open("rb") as stored:
            return pickle.load(stored)  # noqa: S301 - our own file
    solvent = truth["solvent"].split("+")[0].strip()
    solvent = "D2O" if "D2O" in solvent else solvent
    evidence = gather_evidence(
        read_acquired(score.find_raw(folder / "raw")), solvent=solvent
    )
    if kept is not None:
        kept.parent.mkdir(parents=True, exist_ok=True)
        with kept.open("wb") as stored:
            pickle.dump(evidence, stored)
    return evidence


def weigh(smiles: str, bench: Bench) -> tuple[dict[str, Any], Evaluation | None]:
    """Row of one structure against one spectrum."""
    begin = time.process_time()
    try:
        found = evaluate(read_structure(smiles), bench, limits_of(bench.options, None))
    except SpinLedgerError as error:
        return {"smiles": smiles, "error": str(error)}, None
    row: dict[str, Any] = {
        "smiles": smiles,
        "seconds": round(time.process_time() - begin, 2),
        "state": found.state,
        "probability": found.probability,
        "faults": found.faults,
    }
    if found.solution is not None:
        assessment = found.assessment or found.solution.best.assessment
        row["residuals"] = {
            "shift_z": [round(c.shift_z, 2) for c in assessment.claims if c.is_counted],
            "coupling_z": [(round(c.z, 2), c.is_rigid) for c in assessment.couplings],
            "misfit": [
                round(c.residual_share, 3) for c in assessment.claims if c.is_counted
            ],
            "amplitude_log": [
                round(c.amplitude_log, 2) for c in assessment.claims if c.is_counted
            ],
        }
        row["score"] = found.solution.best.assessment.selection_score
        row["match_cost"] = found.solution.match_cost
        row["refined"] = 1 + len(found.solution.others)
    return row, found


def one(
    folder: Path,
    decoys: list[tuple[str, bool]],
    others: list[str],
    score: ModuleType,
    cache: Path | None,
) -> dict[str, Any]:
    """All rows of one spectrum."""
    truth = json.loads((folder / "truth.json").read_text())
    out: dict[str, Any] = {
        "name": folder.name,
        "smiles": truth["smiles"],
        "mixture": truth.get("mixture", False),
    }
    try:
        begin = time.perf_counter()
        evidence = evidence_of(folder, truth, score, cache)
        out["evidence_seconds"] = round(time.perf_counter() - begin, 2)
    except SpinLedgerError as error:
        return {**out, "error": str(error)}
    # A loaded machine must not change what is found.
    bench = lay_out(evidence, ReconcileOptions(time_budget_s=600.0))
    row, found = weigh(truth["smiles"], bench)
    out["true"] = row
    if found is not None:
        ledger = ledger_to_json(ledger_of(found, (), advice=(), options=bench.options))
        out["entries"] = [
            (
                e["claim"],
                e["state"],
                e["predicted_shift_ppm"],
                e["shift_ppm"],
                e["multiplicity"],
            )
            for e in ledger["entries"]
        ]
        if truth.get("protons") and not folder.name.startswith("neg_"):
            out.update(score.compare(truth, ledger))
            out["misplaced"] = misplaced(truth, ledger, score, out["offset_ppm"] or 0.0)
    out["decoys"] = [{**weigh(smiles, bench)[0], "tie": tie} for smiles, tie in decoys]
    out["cross"] = [weigh(smiles, bench)[0] for smiles in others]
    return out


def misplaced(
    truth: dict[str, Any], ledger: dict[str, Any], score: ModuleType, offset: float
) -> list[Any]:
    """Known protons that were not placed, with what they were put to."""
    chosen = score.best_placement(truth, ledger)
    rows = []
    for proton in truth["protons"]:
        entry = chosen.get(proton["label"])
        shift = proton["shift_ppm"] + offset
        if entry is None or abs(entry["shift_ppm"] - shift) > score.PLACED_PPM:
            rows.append(
                (
                    proton["label"],
                    proton["atom"],
                    round(shift, 3),
                    entry and entry["claim"],
                    entry and round(entry["shift_ppm"], 3),
                )
            )
    return rows


def totals(rows: list[dict[str, Any]], score: ModuleType) -> dict[str, Any]:
    """Figures over all spectra."""
    good = [r for r in rows if not r["name"].startswith("neg_") and "true" in r]
    js = [e for r in good for e in r.get("j_errors", [])]
    shift = [e for r in good for e in r.get("shift_errors", [])]
    truths = [r for r in good if not r["mixture"]]
    false = [d for r in good for d in r["decoys"] if not d["tie"] and "state" in d]
    cross = [c for r in good for c in r["cross"] if "state" in c]
    sets = [r for r in good if r["decoys"] and r["true"].get("probability") is not None]
    first = [
        r
        for r in sets
        if all(
            d.get("probability") is None or d["probability"] < r["true"]["probability"]
            for d in r["decoys"]
            if not d["tie"]
        )
    ]
    seconds = [r["true"]["seconds"] for r in good if "seconds" in r["true"]]
    squares = [
        (1 - r["true"]["probability"]) ** 2
        for r in truths
        if r["true"].get("probability") is not None
    ]
    squares += [d["probability"] ** 2 for d in false if d["probability"] is not None]
    return {
        "protons": sum(r.get("protons", 0) for r in good),
        "placed": sum(r.get("placed", 0) for r in good),
        "shift_err_median_ppm": score.quantile(shift, 0.5),
        "j_all": sum(r.get("j_all", 0) for r in good),
        "j_found": sum(r.get("j_seen", 0) for r in good),
        "j_err_median_hz": score.quantile(js, 0.5),
        "j_err_p90_hz": score.quantile(js, 0.9),
        "true": len(truths),
        "accepted": sum(r["true"].get("state") == "reconciled" for r in truths),
        "decoys": len(false),
        "rejected": sum(d["state"] != "reconciled" for d in false),
        "sets": len(sets),
        "first": len(first),
        "cross": len(cross),
        "cross_accepted": sum(c["state"] == "reconciled" for c in cross),
        "brier": statistics.fmean(squares) if squares else None,
        "negatives_accepted": sum(
            r.get("true", {}).get("state") == "reconciled"
            for r in rows
            if r["name"].startswith("neg_")
        ),
        "seconds_median": score.quantile(seconds, 0.5),
        "seconds_max": max(seconds, default=None),
    }


def main() -> int:
    """Run the benchmark."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("acquired", type=Path)
    parser.add_argument("--decoys", type=Path)
    parser.add_argument("--cross", type=int, default=0)
    parser.add_argument("--only", nargs="*", default=[])
    parser.add_argument("--skip", nargs="*", default=[])
    parser.add_argument("--cache", type=Path)
    parser.add_argument("--rows", type=Path)
    args = parser.parse_args()
    score = score_module(args.acquired)
    decoys: dict[str, list[tuple[str, bool]]] = {}
    for line in args.decoys.read_text().splitlines() if args.decoys else ():
        if line.strip() and not line.startswith("#"):
            name, smiles, *mark = line.split("\t")
            decoys.setdefault(name, []).append((smiles, mark == ["tie"]))
    folders = sorted(p.parent for p in args.acquired.glob("*/truth.json"))
    every = {f: json.loads((f / "truth.json").read_text())["smiles"] for f in folders}
    if args.only:
        folders = [f for f in folders if any(word in f.name for word in args.only)]
    folders = [f for f in folders if not any(word in f.name for word in args.skip)]
    rows = []
    for folder in folders:
        flat = "".join(c for c in every[folder] if c not in "@/\\")
        pool = sorted(
            {
                s
                for s in every.values()
                if s and "".join(c for c in s if c not in "@/\\") != flat
            }
        )
        others = random.Random(folder.name).sample(pool, min(args.cross, len(pool)))
        row = one(folder, decoys.get(folder.name, []), others, score, args.cache)
        rows.append(row)
        print(brief(row), file=sys.stderr, flush=True)
        if args.rows:
            args.rows.write_text(json.dumps(rows, indent=1))
    print(json.dumps(totals(rows, score), indent=1))
    return 0


def brief(row: dict[str, Any]) -> str:
    """One line on one spectrum."""
    true = row.get("true", {})
    share = f"{row['placed']}/{row['protons']}" if "placed" in row else "-"
    js = f"{row['j_seen']}/{row['j_all']}" if "j_all" in row else "-"
    probability = true.get("probability")
    wrong = [
        f"{d.get('probability') or 0:.2f}{'t' if d['tie'] else ''}"
        for d in row.get("decoys", [])
    ]
    return (
        f"{row['name']:44s} {true.get('seconds', 0):5.1f}s placed {share:6s} J {js:6s} "
        f"{true.get('state', row.get('error', true.get('error', '-')))[:60]:14s} "
        f"{probability if probability is None else round(probability, 2)} "
        f"decoys {wrong} {row.get('misplaced', '')}"
    )


if __name__ == "__main__":
    raise SystemExit(main())
