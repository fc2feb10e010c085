"""Exchanged fractions of 200 synthetic shake pairs against the true ones.

Prints one JSON object: share within two sd, rms of the residual in sd, median
sd, and the same with the exchangeable proton alone and under another signal.
"""

from __future__ import annotations

import json
import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from shake_cases import draw_pair
from spinledger.sample.exchanged import exchanged_areas

N_DRAWS = 200


def main() -> None:
    """Draw, measure, print."""
    rows = []
    began = time.process_time()
    for seed in range(N_DRAWS):
        pair = draw_pair(np.random.default_rng(seed))
        found = exchanged_areas(pair.before, pair.after, pair.plots, waters=pair.waters)
        rows += [
            (one.fraction - pair.fractions[one.claims[0]], one.sd, one.is_alone)
            for one in found.fractions
            if one.fraction is not None and one.sd is not None
        ]
    alone = [row for row in rows if row[2]]
    under = [row for row in rows if not row[2]]
    result = {
        "draws": N_DRAWS,
        "told": len(rows),
        "all": _figures(rows),
        "alone": _figures(alone),
        "overlapped": _figures(under),
        "cpu_s_per_pair": (time.process_time() - began) / N_DRAWS,
    }
    sys.stdout.write(json.dumps(result, indent=1) + "\n")


def _figures(rows: list[tuple[float, float, bool]]) -> dict[str, float]:
    errors = np.array([row[0] for row in rows])
    sds = np.array([row[1] for row in rows])
    return {
        "n": len(rows),
        "within_2_sd": float(np.mean(np.abs(errors) <= 2.0 * sds)),
        "rms_z": float(np.sqrt(np.mean((errors / sds) ** 2))),
        "median_sd": float(np.median(sds)),
        "median_error": float(np.median(np.abs(errors))),
    }


if __name__ == "__main__":
    main()
