"""Collect the licence of every library that is packaged: ``licences.py FOLDER``.

Runs with the interpreter of the environment that is packaged; standard library
only. Prints the number of libraries.
"""

from __future__ import annotations

import re
import shutil
import sys
from importlib import metadata
from pathlib import Path

_FILE = re.compile(r"(^|/)(licen[cs]e|copying|notice|authors)[^/]*$", re.IGNORECASE)
# Makes the package, is not in it.
_TOOLS = {"pip", "setuptools", "wheel", "pyinstaller", "pyinstaller-hooks-contrib",
          "altgraph", "hatchling", "pathspec", "pluggy", "trove-classifiers",
          "markdown", "spinledger"}  # fmt: skip


def main(folder: Path) -> int:
    """Write one folder a library and LIST.txt; gives the exit code."""
    folder.mkdir(parents=True, exist_ok=True)
    lines = [f"{'python':30s} {sys.version.split()[0]:12s} PSF-2.0"]
    collect_python(folder / "python")
    for one in sorted(metadata.distributions(), key=lambda d: d.name.lower()):
        if one.name.lower() in _TOOLS:
            continue
        count = collect(one, folder / one.name)
        note = "" if count else "  (no licence file in the wheel)"
        lines.append(f"{one.name:30s} {one.version:12s} {declared(one)}{note}")
    (folder / "LIST.txt").write_text("\n".join(lines) + "\n", encoding="utf-8")
    print(len(lines))
    return 0


def collect(distribution: metadata.Distribution, target: Path) -> int:
    """Copy the licence files of a library; gives how many there are."""
    found = [one for one in distribution.files or () if _FILE.search(str(one))]
    found = [one for one in found if one.suffix not in (".py", ".pyc")]
    for rank, one in enumerate(found):
        target.mkdir(exist_ok=True)
        shutil.copy2(one.locate(), target / f"{rank:02d}-{one.name}")
    return len(found)


def collect_python(target: Path) -> None:
    """Copy Python's own licence where the installation keeps it."""
    for place in (Path(sys.base_prefix), Path(metadata.__file__).parents[1]):
        for name in ("LICENSE.txt", "LICENSE"):
            if (place / name).is_file():
                target.mkdir(exist_ok=True)
                shutil.copy2(place / name, target / name)
                return


def declared(distribution: metadata.Distribution) -> str:
    """Licence as the metadata name it."""
    facts = distribution.metadata
    text = facts.get("License-Expression") or facts.get("License") or ""
    if text and "\n" not in text and len(text) < 80:
        return text
    classes = [
        one.rsplit("::", 1)[-1].strip()
        for one in facts.get_all("Classifier") or ()
        if one.startswith("License ::")
    ]
    return "; ".join(classes) or "see the licence file"


if __name__ == "__main__":
    sys.exit(main(Path(sys.argv[1])))
