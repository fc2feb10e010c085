#!/usr/bin/env python3
"""Build and check what is handed out: wheel, sdist, packaged folder.

usage: python3 packaging/build.py            everything
       python3 packaging/build.py wheel      wheel and sdist, installed and run in an empty environment
       python3 packaging/build.py folder     the packaged folder, smoke-tested, as an archive

Standard library only; whatever else is needed goes into environments of its own
below build/. Results lie in dist/. Each step says what it checks; the first one
that fails ends the run with exit code 1.
"""

from __future__ import annotations

import json
import os
import platform
import re
import shutil
import subprocess
import sys
import tarfile
import tempfile
import time
import venv
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
BUILD, DIST, HERE = ROOT / "build", ROOT / "dist", ROOT / "packaging"
PACKAGE = BUILD / "package"
SAMPLE = ROOT / "sample_data" / "batch-117"
STRUCTURE = ROOT / "sample_data" / "structures" / "hydroxy-ester.mol"
BENCH_SECONDS = 12


class BuildError(Exception):
    """A step did not do what it must; one sentence says which."""


def main(arguments: list[str]) -> int:
    """Run the asked-for steps; gives the exit code."""
    steps = {"wheel": [check_wheel], "folder": [build_folder]}
    chosen = arguments or list(steps)
    if any(name not in steps for name in chosen):
        say(__doc__ or "")
        return 2
    try:
        wheel = build_wheel()
        for name in chosen:
            for step in steps[name]:
                step(wheel)
    except BuildError as error:
        say(f"build: {error}")
        return 1
    say("All checks passed.")
    return 0


def say(sentence: str) -> None:
    """Print one line at once."""
    print(sentence, flush=True)


def run(command: list[str | Path], **options: object) -> str:
    """Output of a command that must succeed.

    Raises
    ------
    BuildError
        With the end of what the command said.
    """
    done = subprocess.run(
        [str(word) for word in command],
        check=False,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        **options,  # type: ignore[call-overload]
    )
    if done.returncode:
        raise BuildError(
            f"{Path(str(command[0])).name} {' '.join(map(str, command[1:4]))} ended with "
            f"{done.returncode}:\n{done.stdout[-3000:]}"
        )
    return str(done.stdout)


def clean_environment() -> dict[str, str]:
    """Environment in which only what was installed is found."""
    kept = {k: v for k, v in os.environ.items() if not k.startswith("PYTHON")}
    return kept | {"QT_QPA_PLATFORM": "offscreen", "OMP_NUM_THREADS": "1"}


def environment(name: str) -> Path:
    """Interpreter of a fresh environment below build/."""
    place = BUILD / name
    venv.create(place, clear=True, with_pip=True)
    folder = "Scripts" if sys.platform == "win32" else "bin"
    return place / folder / ("python.exe" if sys.platform == "win32" else "python")


def install(python: Path, *wanted: str) -> None:
    """Install into an environment."""
    run(
        [
            python,
            "-m",
            "pip",
            "install",
            "--quiet",
            "--disable-pip-version-check",
            *wanted,
        ]
    )


def build_wheel() -> Path:
    """Build wheel and sdist into dist/; gives the wheel."""
    say("Building wheel and sdist …")
    python = environment("hatch")
    install(python, "hatchling>=1.26")
    DIST.mkdir(exist_ok=True)
    for old in (*DIST.glob("spinledger-*.whl"), *DIST.glob("spinledger-*.tar.gz")):
        old.unlink()
    run([python, "-m", "hatchling", "build", "-d", DIST], cwd=ROOT)
    return next(DIST.glob("spinledger-*.whl"))


def check_wheel(wheel: Path) -> None:
    """Install the wheel, and then the sdist, in empty environments and run them."""
    say("Checking the wheel in an empty environment …")
    python = environment("empty")
    install(python, f"{wheel}[bench,report]")
    check_programs([python, "-m", "spinledger"], [python, "-m", "spinledger_app"])
    say("Checking the sdist …")
    sdist = next(DIST.glob("spinledger-*.tar.gz"))
    install(python, "--force-reinstall", "--no-deps", str(sdist))
    run([python, "-m", "spinledger", "--version"], env=clean_environment(), cwd=BUILD)


def build_folder(wheel: Path) -> None:
    """Make the packaged folder, check it and pack it."""
    say("Building the packaged folder …")
    python = environment("freeze")
    install(python, f"{wheel}[package]")
    shutil.rmtree(PACKAGE, ignore_errors=True)
    run(
        [
            python, "-m", "PyInstaller", "--noconfirm", "--distpath", PACKAGE,
            "--workpath", BUILD / "pyinstaller", HERE / "spinledger.spec",
        ],
        cwd=BUILD,
        env=clean_environment(),
    )  # fmt: skip
    count = run([python, HERE / "licences.py", PACKAGE / "THIRD-PARTY"]).strip()
    say(f"  {count} licences collected")
    for name in ("INSTALL.md", "linux"):
        copy(HERE / name, PACKAGE / name)
    copy(ROOT / "LICENSE", PACKAGE / "LICENSE")
    (PACKAGE / "linux" / "install.sh").replace(PACKAGE / "install.sh")
    ending = ".exe" if sys.platform == "win32" else ""
    programs = PACKAGE / "spinledger"
    check_programs(
        [programs / f"spinledger{ending}"], [programs / f"spinledger-bench{ending}"]
    )
    if sys.platform.startswith("linux"):
        check_installer(PACKAGE)
    pack(wheel)


def copy(source: Path, target: Path) -> None:
    """Copy a file or a folder."""
    if source.is_dir():
        shutil.copytree(source, target)
    else:
        shutil.copy2(source, target)


def check_programs(command: list[str | Path], bench: list[str | Path]) -> None:
    """Run the command line and the bench as a user would, away from the source."""
    with tempfile.TemporaryDirectory() as place:
        where = {"cwd": place, "env": clean_environment()}
        start = time.perf_counter()
        words = run([*command, "--help"], **where)
        if "reconcile" not in words:
            raise BuildError("--help does not name the commands")
        say(f"  --help in {time.perf_counter() - start:.2f} s")
        out = Path(place, "out")
        run(
            [
                *command, "reconcile", SAMPLE, "--structure", STRUCTURE, "--out", out,
                "--quick", "--formats", "all",
            ],
            **where,
        )  # fmt: skip
        state = json.loads((out / "ledger.json").read_text("utf-8"))["verdict"]["state"]
        if state != "reconciled":
            raise BuildError(f"the sample came out as {state!r}")
        say(f"  the sample is {state}, {len(list(out.iterdir()))} report files")
        check_batch(command, Path(place), where)
        check_bench(bench, where)


def check_batch(
    command: list[str | Path], place: Path, where: dict[str, object]
) -> None:
    """Two rows on two worker processes: a packaged program must start itself."""
    table = place / "table.csv"
    table.write_text(
        "id,data,structure\n"
        + "".join(f"{name},{SAMPLE},{STRUCTURE}\n" for name in ("one", "two")),
        encoding="utf-8",
    )
    words = [*command, "batch", table, "--out", place / "batch", "--workers", "2"]
    run([*words, "--quick"], **where)
    if not (place / "batch" / "two" / "ledger.json").is_file():
        raise BuildError("the batch left no result of its second row")
    say("  a batch on two workers ran")


def check_bench(bench: list[str | Path], where: dict[str, object]) -> None:
    """The bench must open the sample and stay open without a complaint."""
    words = [*bench, SAMPLE, "--structure", STRUCTURE]
    process = subprocess.Popen(
        [str(word) for word in words],
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
        **where,  # type: ignore[call-overload]
    )
    try:
        said, _ = process.communicate(timeout=BENCH_SECONDS)
    except subprocess.TimeoutExpired:
        process.terminate()
        said, _ = process.communicate()
        if "Traceback" in said or "Error" in said:
            raise BuildError(f"the bench complained:\n{said[-2000:]}") from None
        say(f"  the bench was open for {BENCH_SECONDS} s")
        return
    raise BuildError(
        f"the bench closed by itself ({process.returncode}):\n{said[-2000:]}"
    )


def check_installer(package: Path) -> None:
    """Install below a scratch prefix, run from there, and take it away again."""
    with tempfile.TemporaryDirectory() as place:
        prefix = Path(place, "prefix")
        run(["sh", package / "install.sh", prefix])
        run([prefix / "bin" / "spinledger", "--version"], env=clean_environment())
        entry = prefix / "share" / "applications" / "spinledger.desktop"
        check_desktop_entry(entry)
        run(["sh", package / "install.sh", "--remove", prefix])
        left = [one for one in prefix.rglob("*spinledger*") if one.is_file()]
        if left:
            raise BuildError(f"the installer left {left[0]} behind")
    say("  installed, run and removed again")


def check_desktop_entry(entry: Path) -> None:
    """Desktop entry by the desktop's own checker where it is installed."""
    tool = shutil.which("desktop-file-validate")
    if tool is None:
        say("  desktop-file-validate is not here (package desktop-file-utils); skipped")
        return
    run([tool, entry])


def pack(wheel: Path) -> None:
    """Archive of the packaged folder in dist/."""
    found = re.match(r"spinledger-([^-]+)-", wheel.name)
    version = found[1] if found else "unknown"
    system = f"{platform.system()}-{platform.machine()}".lower()
    name = f"spinledger-{version}-{system}"
    with tarfile.open(DIST / f"{name}.tar.gz", "w:gz", compresslevel=6) as archive:
        archive.add(PACKAGE, arcname=name)
    size = (DIST / f"{name}.tar.gz").stat().st_size / 1e6
    folder = (
        sum(one.stat().st_size for one in PACKAGE.rglob("*") if one.is_file()) / 1e6
    )
    say(f"  dist/{name}.tar.gz, {size:.0f} MB (unpacked {folder:.0f} MB)")


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
