"""Damaged copies of real data through the readers: no crash, no hang, bounded memory.

usage: hostile_input.py [N] [--first SEED]

Makes N damaged data sets (default 20,000), each from one seed, and reads each one.
Allowed outcomes are a valid value or a SpinLedgerError; anything else, more than
10 s of processor time, or more than 1 GiB of memory is a failure. Prints one JSON object.
"""

from __future__ import annotations

import argparse
import io
import json
import multiprocessing
import re
import resource
import shutil
import signal
import sys
import tempfile
import time
import warnings
import zipfile
from collections import Counter
from pathlib import Path

import numpy as np

from shared_data import SHARED
from spinledger.errors import SpinLedgerError
from spinledger.io.read import list_experiments, read_acquired
from spinledger.values.acquisition import Fid

Files = dict[str, bytes]

LIMIT_S = 10.0
LIMIT_BYTES = 2**30
BATCH = 500
# Wall time without a word from a worker: far above any load on the machine.
SILENCE_S = 900.0
# Small representatives of every format; the folder is the data set itself.
SOURCES = (
    "br_l-alanine_bmse000028/raw/1H",
    "br_l-tyrosine_bmse000051/raw/1H",
    "br_gaba_metabohub/raw",
    "brn_menthol/raw/10",
    "va_2-ketobutyric-acid/raw/HMDB00005.fid",
    "jc_aspirin/raw",
    "jc_estragole/raw",
    "jc_coumarin/raw",
    "os_r-carvone/raw",
    "os_tert-butylamine/raw",
    "jeol_resveratrol/raw",
    "neg_inosine_13C-in-1H-set/raw/Inosine-saturated",
)
NUMBERS = [
    "0",
    "-1",
    "1",
    "2",
    "3",
    "1e308",
    "-1e308",
    "1e-308",
    "nan",
    "inf",
    "-inf",
    "4294967296",
    "2147483647",
    "99999999999999999999",
    "1,5",
    "1.5.5",
    "-",
    "<>",
    "()",
    "(0..9999999999)",
    "true",
    "0x10",
    "",
]


def load_sources() -> list[Files]:
    """Files of every source by relative path, and one columns and one Spinsolve set."""
    loaded = []
    for name in SOURCES:
        folder = SHARED / "acquired" / name
        if folder.is_dir():
            loaded.append(
                {
                    path.relative_to(folder).as_posix(): path.read_bytes()
                    for path in sorted(folder.rglob("*"))
                    if path.is_file()
                }
            )
    return [*loaded, columns_files(), spinsolve_files()]


def columns_files() -> Files:
    """A spectrum as plain text in two columns."""
    shifts = 10.0 - 0.002 * np.arange(4000)
    values = 1e3 / (1 + ((shifts - 4.0) / 0.003) ** 2)
    rows = "\n".join(f"{x:.5f}\t{y:.3f}" for x, y in zip(shifts, values, strict=True))
    return {"spectrum.txt": f"# 400.13 MHz, ppm\n{rows}\n".encode()}


def spinsolve_files() -> Files:
    """A Spinsolve folder with one decaying line."""
    times = np.arange(2048) / 5000.0
    fid = np.exp(2j * np.pi * 100 * times - times * 3)
    interleaved = np.empty(2 * fid.size, "<f4")
    interleaved[0::2], interleaved[1::2] = fid.real, fid.imag
    header = b"SORPATAD1.1V" + np.array([504, 2048, 1, 1, 1], "<i4").tobytes()
    parameters = (
        'b1Freq = 60.1\nbandwidth = 5\nlowestFrequency = -2200\nrxChannel = "1H"\n'
        'nrScans = 4\nSolvent = "CDCl3"\nstartTime = "2023-04-05T10:00:00"\n'
    )
    body = (times * 1e3).astype("<f4").tobytes() + interleaved.tobytes()
    return {"acqu.par": parameters.encode(), "data.1d": header + body}


# ---- damage


def truncate(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    files[name] = files[name][: int(rng.integers(0, len(files[name]) + 1))]


def flip_bits(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    content = bytearray(files[name])
    # Headers stand first in most files: aim there half the time.
    reach = min(len(content), 2000) if rng.random() < 0.5 else len(content)
    for _n in range(int(rng.integers(1, 65))):
        if reach:
            content[int(rng.integers(0, reach))] ^= 1 << int(rng.integers(0, 8))
    files[name] = bytes(content)


def overwrite(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    content = bytearray(files[name])
    start = int(rng.integers(0, len(content) + 1))
    length = int(rng.integers(1, 4096))
    kind = rng.integers(0, 4)
    fill = (
        rng.bytes(length)
        if kind == 0
        else bytes([(0, 255, 10)[int(kind) - 1]]) * length
    )
    content[start : start + length] = fill
    files[name] = bytes(content)


def delete(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    del files[pick(files, rng)]


def swap_header(files: Files, rng: np.random.Generator, others: list[Files]) -> None:
    other = others[int(rng.integers(0, len(others)))]
    files[pick(files, rng)] = other[pick(other, rng)]


def absurd_number(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    text = files[name].decode("latin-1")
    places = list(
        re.finditer(r"(?<=[=\"\s])[+-]?\d[\d.]*(?:[eE][+-]?\d+)?", text[:40_000])
    )
    for _n in range(int(rng.integers(1, 6))):
        if places:
            place = places.pop(int(rng.integers(0, len(places))))
            number = NUMBERS[int(rng.integers(0, len(NUMBERS)))]
            text = text[: place.start()] + number + text[place.end() :]
            places = [other for other in places if other.end() < place.start()]
    files[name] = text.encode("latin-1")


def not_a_number(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    content = bytearray(files[name])
    special = np.array([np.nan, np.inf, -np.inf, 1e300])[int(rng.integers(0, 4))]
    order = "<>"[int(rng.integers(0, 2))]
    word = np.array(special, f"{order}f8").tobytes()
    start = 8 * int(rng.integers(0, len(content) // 8 + 1))
    content[start : start + 8] = word
    files[name] = bytes(content)


def repeat_bomb(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    content = bytearray(files[name])
    start = int(rng.integers(0, len(content) + 1))
    content[start:start] = b"Z99999999S88888888%s999999"
    files[name] = bytes(content)


def grow(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    files[name] = files[name] + rng.bytes(int(rng.integers(1, 10_000)))


def duplicate(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    files[f"copy/{name}"] = files[name]


def rename(files: Files, rng: np.random.Generator, _: list[Files]) -> None:
    name = pick(files, rng)
    names = ("fid", "ser", "acqus", "acqu2s", "procpar", "data.txt", "x.dx", "ä ß.jdf")
    files[names[int(rng.integers(0, len(names)))]] = files.pop(name)


DAMAGES = (
    truncate,
    flip_bits,
    overwrite,
    delete,
    swap_header,
    absurd_number,
    absurd_number,
    not_a_number,
    repeat_bomb,
    grow,
    duplicate,
    rename,
)


def pick(files: Files, rng: np.random.Generator) -> str:
    return sorted(files)[int(rng.integers(0, len(files)))]


def damaged(sources: list[Files], seed: int) -> Files:
    """One damaged data set, the same for the same seed."""
    rng = np.random.default_rng(seed)
    files = dict(sources[int(rng.integers(0, len(sources)))])
    for _n in range(int(rng.integers(1, 4))):
        if files:
            DAMAGES[int(rng.integers(0, len(DAMAGES)))](files, rng, sources)
    return files


def lay_out(files: Files, seed: int, folder: Path) -> Path:
    """Write the data set; some as a zip, some zips damaged themselves."""
    rng = np.random.default_rng([seed, 1])
    if rng.random() < 0.15:
        packed = io.BytesIO()
        with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as archive:
            for name, content in files.items():
                archive.writestr(name, content)
        content = bytearray(packed.getvalue())
        if rng.random() < 0.7 and content:
            for _n in range(int(rng.integers(1, 30))):
                content[int(rng.integers(0, len(content)))] ^= 1 << int(
                    rng.integers(0, 8)
                )
        target = folder / "data.zip"
        target.write_bytes(bytes(content))
        return target
    place = folder / "data"
    place.mkdir()
    for name, content in files.items():
        target = place / name
        if target.is_dir():
            continue
        target.parent.mkdir(parents=True, exist_ok=True)
        target.write_bytes(content)
    written = [path for path in place.rglob("*") if path.is_file()]
    if written and rng.random() < 0.3:
        return written[int(rng.integers(0, len(written)))]
    return place


# ---- outcome


def outcome(place: Path, *, prefer_processed: bool) -> str:
    """ "value" or "refused"; raises whatever else the readers raise."""
    try:
        list_experiments(place)
        acquired = read_acquired(place, prefer_processed=prefer_processed)
    except SpinLedgerError as error:
        sentence = str(error)
        if "\n" in sentence or not sentence.isprintable() or len(sentence) > 2000:
            raise AssertionError(f"not one plain sentence: {sentence!r}") from error
        return "refused"
    require_valid(acquired)
    return "value"


def require_valid(acquired: object) -> None:
    """Check what the rest of the program relies on."""
    if isinstance(acquired, Fid):
        numbers = acquired.samples
        assert acquired.metadata.nucleus == "1H"
        assert 0 <= acquired.group_delay_points < numbers.size
        assert 10 <= acquired.spectral_width_hz <= 1e7
    else:
        numbers = acquired.spectrum.intensities  # type: ignore[attr-defined]
        assert np.isfinite(acquired.spectrum.first_point_ppm)  # type: ignore[attr-defined]
    assert numbers.size >= 64
    assert np.all(np.isfinite(numbers))


def run_case(sources: list[Files], seed: int, scratch: Path) -> tuple[str, float]:
    """Outcome and processor seconds of one seed."""
    folder = Path(tempfile.mkdtemp(dir=scratch))
    try:
        place = lay_out(damaged(sources, seed), seed, folder)
        begin = time.process_time()
        found = outcome(place, prefer_processed=seed % 5 == 0)
        return found, time.process_time() - begin
    finally:
        shutil.rmtree(folder)


def stop_hang(signal_number: int, frame: object) -> None:
    """End a case that has used up its processor time."""
    raise TimeoutError(f"more than {LIMIT_S:.0f} s")


def run_batch(seeds: range, results: multiprocessing.Queue) -> None:
    """One worker process: a batch of seeds with memory measured."""
    warnings.simplefilter("error")
    signal.signal(signal.SIGPROF, stop_hang)
    sources = load_sources()
    with tempfile.TemporaryDirectory() as scratch:
        for seed in seeds:
            results.put(("began", seed))
            signal.setitimer(signal.ITIMER_PROF, LIMIT_S)
            try:
                found, seconds = run_case(sources, seed, Path(scratch))
            except Exception as error:  # noqa: BLE001 - this is the finding itself
                found, seconds = f"{type(error).__name__}: {error}"[:300], 0.0
            results.put(("ended", seed, found, seconds))
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024
    results.put(("peak", peak))


def drain(batch: range) -> tuple[dict[int, tuple[str, float]], int, str | None]:
    """Run one batch in a process of its own; what came back, and how it died."""
    context = multiprocessing.get_context("spawn")
    results = context.Queue()
    worker = context.Process(target=run_batch, args=(batch, results))
    worker.start()
    done: dict[int, tuple[str, float]] = {}
    peak, current = 0, None
    while True:
        try:
            message = results.get(timeout=SILENCE_S)
        except Exception:  # noqa: BLE001 - queue.Empty, or a pipe the worker broke
            worker.kill()
            return done, peak, f"seed {current} hung or killed the worker"
        if message[0] == "began":
            current = message[1]
        elif message[0] == "ended":
            done[message[1]] = (message[2], message[3])
        else:
            peak = message[1]
            worker.join()
            return done, peak, None


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("n", nargs="?", type=int, default=20_000)
    parser.add_argument("--first", type=int, default=0)
    options = parser.parse_args()
    outcomes: Counter[str] = Counter()
    failures: list[str] = []
    slowest, slowest_seed, peak = 0.0, None, 0
    for start in range(options.first, options.first + options.n, BATCH):
        stop = min(start + BATCH, options.first + options.n)
        done, batch_peak, death = drain(range(start, stop))
        peak = max(peak, batch_peak)
        if death is not None:
            failures.append(death)
        for seed, (found, seconds) in done.items():
            outcomes[found if found in ("value", "refused") else "fault"] += 1
            if found not in ("value", "refused"):
                failures.append(f"seed {seed}: {found}")
            if seconds > slowest:
                slowest, slowest_seed = seconds, seed
            if seconds > LIMIT_S:
                failures.append(f"seed {seed}: took {seconds:.1f} s")
        print(
            f"{sum(outcomes.values())} cases, {len(failures)} failures", file=sys.stderr
        )
    if peak > LIMIT_BYTES:
        failures.append(f"memory {peak / 2**20:.0f} MiB")
    print(
        json.dumps(
            {
                "cases": sum(outcomes.values()),
                "outcomes": dict(outcomes),
                "failures": failures[:50],
                "n_failures": len(failures),
                "slowest_s": round(slowest, 3),
                "slowest_seed": slowest_seed,
                "peak_mib": round(peak / 2**20),
            }
        )
    )


if __name__ == "__main__":
    main()
