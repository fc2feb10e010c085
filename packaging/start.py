#!/usr/bin/env python3
"""Make the environment and start Spin Ledger, or run its tests.

usage: python3 packaging/start.py          make .venv, install, run on the sample data
       python3 packaging/start.py test     make .venv, install, run the tests

Standard library only; works from a bare Python 3.11 or later on Debian-like
Linux, Windows and macOS. With a display the bench opens on the sample data;
without one the spectrum is reconciled and the place of the report is printed.
What follows ``test`` is handed to pytest.
"""

from __future__ import annotations

import ctypes
import hashlib
import os
import platform
import shutil
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
VENV = ROOT / ".venv"
OUT = ROOT / "spinledger-out"
SAMPLE = ROOT / "sample_data" / "batch-117"
SAMPLE_STRUCTURE = ROOT / "sample_data" / "structures" / "hydroxy-ester.mol"
OLDEST_PYTHON = (3, 11)

# Shared library that must load -> Debian package that brings it.
ENGINE_LIBRARIES = {"libgomp.so.1": "libgomp1"}
QT_LIBRARIES = {
    "libEGL.so.1": "libegl1",
    "libGL.so.1": "libgl1",
    "libxkbcommon.so.0": "libxkbcommon0",
    "libdbus-1.so.3": "libdbus-1-3",
    "libfontconfig.so.1": "libfontconfig1",
    "libglib-2.0.so.0": "libglib2.0-0",
    "libX11-xcb.so.1": "libx11-xcb1",
    "libxkbcommon-x11.so.0": "libxkbcommon-x11-0",
    "libxcb-cursor.so.0": "libxcb-cursor0",
    "libxcb-icccm.so.4": "libxcb-icccm4",
    "libxcb-image.so.0": "libxcb-image0",
    "libxcb-keysyms.so.1": "libxcb-keysyms1",
    "libxcb-randr.so.0": "libxcb-randr0",
    "libxcb-render-util.so.0": "libxcb-render-util0",
    "libxcb-shape.so.0": "libxcb-shape0",
    "libxcb-shm.so.0": "libxcb-shm0",
    "libxcb-sync.so.1": "libxcb-sync1",
    "libxcb-util.so.1": "libxcb-util1",
    "libxcb-xfixes.so.0": "libxcb-xfixes0",
    "libxcb-xkb.so.1": "libxcb-xkb1",
}


def main(arguments: list[str]) -> int:
    """Run one of the two commands; gives the exit code."""
    if sys.version_info < OLDEST_PYTHON:
        say(f"Python 3.11 or later is needed; this is {platform.python_version()}.")
        return 1
    if arguments and arguments[0] != "test":
        say(__doc__ or "")
        return 2
    testing = bool(arguments)
    if not provide_system_libraries(with_qt=testing or has_display()):
        return 1
    python = provide_environment("test" if testing else "bench,report")
    if python is None:
        return 1
    return run_tests(python, arguments[1:]) if testing else run_sample(python)


def say(sentence: str) -> None:
    """Print one line at once, so that it stands before a child's output."""
    print(sentence, flush=True)


def has_display() -> bool:
    """Whether a window can be shown here."""
    if sys.platform in ("win32", "darwin"):
        return True
    return bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))


def can_load(library: str) -> bool:
    """Whether the dynamic loader finds a shared library."""
    try:
        ctypes.CDLL(library)
    except OSError:
        return False
    return True


def provide_system_libraries(*, with_qt: bool) -> bool:
    """Install missing shared libraries where that is possible, else say how."""
    if not sys.platform.startswith("linux"):
        return True
    wanted = ENGINE_LIBRARIES | (QT_LIBRARIES if with_qt else {})
    missing = sorted({pkg for lib, pkg in wanted.items() if not can_load(lib)})
    return not missing or install_packages(missing)


def install_packages(packages: list[str]) -> bool:
    """Install Debian packages as root, or print the exact command."""
    command = ["apt-get", "install", "-y", "--no-install-recommends", *packages]
    is_root = hasattr(os, "geteuid") and os.geteuid() == 0
    if shutil.which("apt-get") is None:
        say("Please install these system libraries first: " + ", ".join(packages))
        return False
    if not is_root:
        say("Some system libraries are missing. Please run:")
        say("  sudo " + " ".join(command))
        return False
    say("Installing system libraries: " + ", ".join(packages))
    quiet = dict(os.environ, DEBIAN_FRONTEND="noninteractive")
    subprocess.run(["apt-get", "update", "-qq"], env=quiet, check=False)
    done = subprocess.run(command, env=quiet, check=False, stdout=subprocess.DEVNULL)
    if done.returncode:
        say("The system libraries could not be installed; the lines above say why.")
    return done.returncode == 0


def environment_python() -> Path:
    """Where the environment keeps its interpreter."""
    if sys.platform == "win32":
        return VENV / "Scripts" / "python.exe"
    return VENV / "bin" / "python"


def provide_environment(extras: str) -> Path | None:
    """Make ``.venv`` and install the project; does nothing when nothing changed."""
    python = environment_python()
    stamp = VENV / f"installed-{extras.replace(',', '-')}.txt"
    wanted = fingerprint()
    if python.exists() and stamp.exists() and stamp.read_text() == wanted:
        return python
    if not (python.exists() and has_pip(python)) and not make_venv():
        return None
    say(f"Installing Spin Ledger [{extras}] into {VENV.name} …")
    done = subprocess.run(
        [
            str(python), "-m", "pip", "install", "--quiet",
            "--disable-pip-version-check", "--editable", f"{ROOT}[{extras}]",
        ],
        check=False,
    )  # fmt: skip
    if done.returncode:
        say("The installation failed; the lines above say why.")
        return None
    stamp.write_text(wanted)
    return python


def fingerprint() -> str:
    """Changes when the project's requirements, place or interpreter change."""
    text = (ROOT / "pyproject.toml").read_bytes()
    where = f"{platform.python_version()} {ROOT}".encode()
    return hashlib.sha256(text + where).hexdigest()


def has_pip(python: Path) -> bool:
    """Whether an environment is whole enough to install into."""
    done = subprocess.run(
        [str(python), "-m", "pip", "--version"], check=False, capture_output=True
    )
    return done.returncode == 0


def make_venv() -> bool:
    """Create ``.venv``; Debian keeps the module that does it in its own package."""
    say(f"Making {VENV.name} …")
    command = [sys.executable, "-m", "venv", "--clear", str(VENV)]
    done = subprocess.run(command, check=False, capture_output=True, text=True)
    if done.returncode and shutil.which("apt-get"):
        version = f"{sys.version_info.major}.{sys.version_info.minor}"
        if not install_packages([f"python{version}-venv"]):
            return False
        done = subprocess.run(command, check=False, capture_output=True, text=True)
    if done.returncode:
        say(done.stdout + done.stderr)
    return done.returncode == 0


def run_tests(python: Path, arguments: list[str]) -> int:
    """Run the suite on all cores, without a screen."""
    environment = dict(
        os.environ,
        QT_QPA_PLATFORM="offscreen",
        OMP_NUM_THREADS="1",
        OPENBLAS_NUM_THREADS="1",
    )
    command = [str(python), "-m", "pytest", "-n", "auto", *arguments]
    return subprocess.run(command, cwd=ROOT, env=environment, check=False).returncode


def run_sample(python: Path) -> int:
    """Do the main job on the sample data."""
    if has_display():
        say("Opening the bench on the sample data …")
        command = [
            str(python), "-m", "spinledger_app", str(SAMPLE),
            "--structure", str(SAMPLE_STRUCTURE),
        ]  # fmt: skip
        return subprocess.run(command, cwd=ROOT, check=False).returncode
    say("No display here: reconciling the sample data …")
    command = [
        str(python), "-m", "spinledger", "reconcile", str(SAMPLE),
        "--structure", str(SAMPLE_STRUCTURE), "--out", str(OUT),
    ]  # fmt: skip
    done = subprocess.run(command, cwd=ROOT, check=False)
    if done.returncode == 0:
        say(f"The report lies at {OUT / 'report.html'}")
    return done.returncode


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
