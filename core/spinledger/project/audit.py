"""Audit trail of a project as plain lines, and whether a report would differ."""

from __future__ import annotations

import platform
from collections.abc import Mapping
from importlib import metadata

from spinledger import __version__
from spinledger.project.document import Project

_LIBRARIES = ("numpy", "scipy", "rdkit", "nmrglue", "pybaselines", "lightgbm")


def versions() -> dict[str, str]:
    """Version of this program, of Python and of every library that computes.

    Returns
    -------
    dict of str to str
        "spinledger", "python", then the libraries; one that is not installed
        is left out.
    """
    found = {"spinledger": __version__, "python": platform.python_version()}
    for name in _LIBRARIES:
        try:
            found[name] = metadata.version(name)
        except metadata.PackageNotFoundError:
            continue
    return found


def audit_lines(project: Project) -> tuple[str, ...]:
    """Every recorded step in order, "time  what", hand edits marked.

    Parameters
    ----------
    project : Project

    Returns
    -------
    tuple of str
    """
    return tuple(
        f"{line.when}  {'by hand: ' if line.by_hand else ''}{line.what}"
        for line in project.audit
    )


def differences_when_remade(
    project: Project, written_with: Mapping[str, str]
) -> tuple[str, ...]:
    """Why a report made now could differ from one that was written before.

    Parameters
    ----------
    project : Project
    written_with : mapping of str to str
        The "versions" part of that report's ledger.json.

    Returns
    -------
    tuple of str
        One sentence a reason; empty if it would be the same.
    """
    now = versions()
    reasons = [
        f"{name} was {written_with[name]} then and is {now.get(name, 'absent')} now."
        for name in written_with
        if written_with[name] != now.get(name)
    ]
    if project.needs_evidence:
        reasons.append("The spectrum has to be processed again.")
    if project.needs_ledger:
        reasons.append("The ledger has to be solved again after the last edits.")
    return tuple(reasons)
