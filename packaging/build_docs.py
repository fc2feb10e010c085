"""Build the guide and the library page: ``python packaging/build_docs.py [OUT]``.

Needs the package ``markdown`` (extra ``package``). The worked example is run and
its output put into the page, so that the page cannot drift from the program; the
list of functions is read from the code. Pages lie in build/docs if nothing is said.
"""

from __future__ import annotations

import ast
import re
import shutil
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import markdown

ROOT = Path(__file__).resolve().parents[1]
PAGES = ROOT / "packaging" / "docs"
CORE = ROOT / "core" / "spinledger"
# What a script is likely to want, room by room.
MODULES = (
    "io/read.py", "io/write.py", "processing/recipe.py", "processing/solvents.py",
    "detection/evidence.py", "structure/read.py", "prediction/claims.py",
    "spins/engine.py", "spins/tree.py", "reconcile/run.py", "reconcile/options.py",
    "project/edits.py", "project/storage.py", "quantity/purity.py",
    "quantity/content.py", "report/write.py", "report/context.py", "report/text.py",
    "report/compare.py", "report/nmredata.py", "batch/job.py", "batch/run.py",
)  # fmt: skip
STYLE = """
html { background: #FDFCF9; color: #1D2226; font: 16px/1.55 "Source Sans 3",
  "Source Sans Pro", system-ui, sans-serif; }
body { max-width: 46rem; margin: 2rem auto; padding: 0 1rem; }
nav { border-bottom: 1px solid #A8A294; padding-bottom: .5rem; }
nav a { margin-right: 1.2rem; }
a { color: #005E94; }
pre { background: #F1EEE6; padding: .7rem .9rem; overflow-x: auto; }
code { font-size: .9em; }
table { border-collapse: collapse; }
th, td { text-align: left; vertical-align: top; padding: .25rem 1rem .25rem 0;
  border-bottom: 1px solid #DDD8CC; }
img { max-width: 100%; height: auto; }
"""


def main(arguments: list[str]) -> int:
    """Write every page; gives the exit code."""
    out = Path(arguments[0]) if arguments else ROOT / "build" / "docs"
    out.mkdir(parents=True, exist_ok=True)
    for picture in (*PAGES.glob("*.svg"), *PAGES.glob("*.png")):
        shutil.copy2(picture, out / picture.name)
    pages = {
        "guide": ("User guide", (PAGES / "guide.md").read_text("utf-8")),
        "api": ("Library", api_text()),
        "INSTALL": ("Installing", (PAGES.parent / "INSTALL.md").read_text("utf-8")),
    }
    links = "".join(
        f'<a href="{name}.html">{title}</a>' for name, (title, _) in pages.items()
    )
    for name, (title, text) in pages.items():
        body = markdown.markdown(text, extensions=["tables", "fenced_code"])
        (out / f"{name}.html").write_text(page(title, links, body), encoding="utf-8")
    faults = list(broken_links(out))
    for fault in faults:
        print(fault)
    print(f"{len(pages)} pages in {out}")
    return 1 if faults else 0


def page(title: str, links: str, body: str) -> str:
    """A whole page that refers to nothing on the network."""
    return (
        f'<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8"><title>{title}, '
        f"Spin Ledger</title><style>{STYLE}</style></head><body><nav>{links}</nav>"
        f"{body}</body></html>\n"
    )


def api_text() -> str:
    """The library page with example, its output, and the list of functions."""
    script = PAGES / "example.py"
    done = subprocess.run(
        [sys.executable, str(script), str(ROOT / "sample_data")],
        check=True,
        capture_output=True,
        text=True,
    )
    text = (PAGES / "api.md").read_text("utf-8")
    text = text.replace("EXAMPLE", fenced(script.read_text("utf-8")))
    text = text.replace("OUTPUT", fenced(done.stdout))
    return text.replace("REFERENCE", "\n".join(map(module_text, MODULES)))


def fenced(text: str) -> str:
    """Text as a block of code."""
    return f"```\n{text.strip()}\n```"


def module_text(name: str) -> str:
    """Heading, sentence and public names of a module, from its source."""
    tree = ast.parse((CORE / name).read_text("utf-8"))
    dotted = "spinledger." + name.removesuffix(".py").replace("/", ".")
    lines = [f"### {dotted}", "", first_line(tree), ""]
    for node in tree.body:
        is_public = isinstance(node, ast.FunctionDef | ast.ClassDef)
        if not is_public or node.name.startswith("_"):
            continue
        call = (
            f"({ast.unparse(node.args)})" if isinstance(node, ast.FunctionDef) else ""
        )
        lines += [f"- `{node.name}{call}`  ", f"  {first_line(node)}"]
    return "\n".join((*lines, ""))


def first_line(node: ast.Module | ast.FunctionDef | ast.ClassDef) -> str:
    """First sentence of a docstring."""
    return (ast.get_docstring(node) or "").split("\n\n")[0].replace("\n", " ")


def broken_links(out: Path) -> Iterator[str]:
    """Links and pictures of the pages that lead nowhere."""
    for one in out.glob("*.html"):
        for target in re.findall(r'(?:href|src)="([^"#]+)"', one.read_text("utf-8")):
            if not target.startswith("http") and not (out / target).exists():
                yield f"{one.name}: {target} is not there"


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
