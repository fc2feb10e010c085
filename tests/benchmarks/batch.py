"""Speed, memory and resuming of batch runs; prints one JSON object.

usage: python tests/benchmarks/batch.py ACQUIRED [--rows N] [--kills N] [--full]
                                          [--only NAME,NAME]

The acquired spectra are repeated under new names until there are N rows. Keys:
speedup_2 (one worker's time over two workers'), dask_ratio (time on a local
cluster of two over two processes), memory_growth (resident memory after the
last row over that after row 20, minus 1), resumed_identical (a run that was
killed at random moments gives the same ledgers as one that was not).
"""

from __future__ import annotations

import argparse
import json
import os
import random
import signal
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from spinledger.batch.run import run_table
from spinledger.reconcile.options import ReconcileOptions

SETTLED_ROW = 20


def find_data(raw: Path) -> Path:
    """The dataset in a raw folder."""
    for pattern in ("**/acqus", "**/procpar"):
        hits = sorted(raw.glob(pattern))
        if hits:
            return hits[0].parent
    for pattern in ("**/*.jdf", "**/*fid.dx", "**/*.dx", "**/*.jdx"):
        hits = sorted(raw.glob(pattern))
        if hits:
            return hits[0]
    raise SystemExit(f"no dataset under {raw}")


def write_table(acquired: Path, path: Path, n_rows: int, only: set[str]) -> None:
    """Table that repeats the true spectra, or some of them."""
    rows = []
    for folder in sorted(acquired.iterdir()):
        truth_file = folder / "truth.json"
        if only and folder.name not in only:
            continue
        if folder.name.startswith("neg_") or not truth_file.is_file():
            continue
        truth = json.loads(truth_file.read_text(encoding="utf-8"))
        solvent = truth["solvent"].split("+")[0].strip()
        solvent = "D2O" if "D2O" in solvent else solvent
        rows.append((find_data(folder / "raw"), truth["smiles"], solvent))
    lines = ["id,data,structure,solvent"]
    for rank in range(n_rows):
        data, smiles, solvent = rows[rank % len(rows)]
        lines.append(f"row-{rank:04d},{data.resolve()},{smiles},{solvent}")
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


def timed(table: Path, out: Path, options: ReconcileOptions, **how: object) -> float:
    """Seconds of a whole run."""
    start = time.perf_counter()
    run_table(table, out, options=options, **how)  # type: ignore[arg-type]
    return time.perf_counter() - start


def resident_bytes() -> int:
    """Resident memory of this process (Linux)."""
    pages = int(Path("/proc/self/statm").read_text(encoding="ascii").split()[1])
    return pages * os.sysconf("SC_PAGE_SIZE")


def timed_with_memory(
    table: Path, out: Path, options: ReconcileOptions
) -> tuple[float, float | None]:
    """Seconds of a run in this process, and its memory's growth from row 20 on."""
    sizes: list[int] = []
    seconds = timed(
        table,
        out,
        options,
        progress=lambda _words, _fraction: sizes.append(resident_bytes()),
    )
    if len(sizes) <= SETTLED_ROW:
        return seconds, None
    return seconds, sizes[-1] / sizes[SETTLED_ROW - 1] - 1


def dask_seconds(table: Path, out: Path, options: ReconcileOptions) -> float:
    """Seconds on a local cluster of two."""
    from distributed import LocalCluster  # an extra

    with LocalCluster(
        n_workers=2, threads_per_worker=1, dashboard_address=None
    ) as cluster:
        return timed(table, out, options, cluster=cluster.scheduler_address)


def survives_kills(
    table: Path, whole: Path, out: Path, *, kills: int, longest: float, quick: bool
) -> bool:
    """Same ledgers after a run that was killed again and again."""
    command = [
        sys.executable,
        "-m",
        "spinledger",
        "batch",
        str(table),
        "--workers",
        "2",
    ]
    command += ["--out", str(out), *(["--quick"] if quick else [])]
    rng = random.Random(3)
    for _ in range(kills):
        child = subprocess.Popen(
            command,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
            start_new_session=True,
        )
        try:
            child.wait(timeout=rng.uniform(2, longest))
        except subprocess.TimeoutExpired:
            os.killpg(child.pid, signal.SIGKILL)
            child.wait()
    subprocess.run(command, check=False, capture_output=True)
    names = sorted(one.parent.name for one in whole.glob("*/ledger.json"))
    return names == sorted(
        one.parent.name for one in out.glob("*/ledger.json")
    ) and all(
        (whole / name / "ledger.json").read_bytes()
        == (out / name / "ledger.json").read_bytes()
        for name in names
    )


def main() -> None:
    """Run everything and print the figures."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n")[0])
    parser.add_argument("acquired", type=Path)
    parser.add_argument("--rows", type=int, default=200)
    parser.add_argument("--kills", type=int, default=10)
    parser.add_argument(
        "--full", action="store_true", help="with contenders and advice"
    )
    parser.add_argument(
        "--only", default="", help="folders to take, instead of all, in a comma list"
    )
    arguments = parser.parse_args()
    options = ReconcileOptions(quick=not arguments.full)
    with tempfile.TemporaryDirectory() as place:
        base = Path(place)
        table = base / "table.csv"
        only = {name for name in arguments.only.split(",") if name}
        write_table(arguments.acquired, table, arguments.rows, only)
        one, growth = timed_with_memory(table, base / "one", options)
        two = timed(table, base / "two", options, workers=2)
        figures = {
            "rows": arguments.rows,
            "seconds_1": one,
            "seconds_2": two,
            "speedup_2": one / two,
            "dask_ratio": dask_seconds(table, base / "dask", options) / two,
            "memory_growth": growth,
            "resumed_identical": survives_kills(
                table,
                base / "two",
                base / "killed",
                kills=arguments.kills,
                # Kills fall anywhere in the run, not all after its end.
                longest=max(4.0, 2.0 * two / max(arguments.kills, 1)),
                quick=options.quick,
            ),
        }
    print(json.dumps(figures, indent=1))


if __name__ == "__main__":
    main()
