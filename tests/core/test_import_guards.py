"""The core imports no Qt, and the package itself imports nothing heavy."""

import json
import pkgutil
import subprocess
import sys
from pathlib import Path

import spinledger

QT_MODULES = ("PySide6", "shiboken6", "pyqtgraph", "spinledger_app")
HEAVY_MODULES = ("numpy", "scipy", "rdkit", "nmrglue", "lightgbm", "pybaselines")


def loaded_after(statement: str) -> set[str]:
    """Top-level modules in a fresh interpreter after a statement."""
    code = (
        f"{statement}\nimport json, sys\n"
        "print(json.dumps(sorted({name.split('.')[0] for name in sys.modules})))"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True
    )
    return set(json.loads(done.stdout.splitlines()[-1]))


def core_modules() -> list[str]:
    found = pkgutil.walk_packages(spinledger.__path__, "spinledger.")
    return sorted(m.name for m in found if not m.name.endswith("__main__"))


def test_no_core_module_loads_qt() -> None:
    modules = core_modules()
    assert len(modules) > 50
    loaded = loaded_after("\n".join(f"import {name}" for name in modules))
    assert "spinledger" in loaded
    assert loaded.isdisjoint(QT_MODULES)


def test_package_and_command_line_start_without_heavy_imports() -> None:
    loaded = loaded_after("import spinledger, spinledger.cli")
    assert loaded.isdisjoint(HEAVY_MODULES)


def test_no_core_file_but_io_names_the_vendor_reader() -> None:
    root = Path(spinledger.__path__[0])
    offenders = [
        path.relative_to(root).as_posix()
        for path in root.rglob("*.py")
        if "import nmrglue" in path.read_text(encoding="utf-8")
        and path.relative_to(root).parts[0] != "io"
    ]
    assert offenders == []


def test_reading_and_processing_start_without_libraries_they_rarely_need() -> None:
    # scipy.stats and scipy.signal cost half a second, nmrglue brings both.
    code = "import sys, spinledger.detection.evidence, spinledger.io.read\n"
    code += "print([n for n in ('scipy.stats', 'scipy.signal', 'nmrglue') "
    code += "if n in sys.modules])"
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True
    )
    assert done.stdout.strip() == "[]"
