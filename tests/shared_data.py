"""Where the acquired spectra and published tables lie, or a plain reason to skip."""

import os
from pathlib import Path

import pytest

SHARED = Path(
    os.environ.get("SPINLEDGER_SHARED", Path(__file__).resolve().parents[2] / "shared")
)


def shared(*parts: str) -> Path:
    """Path in the shared folder; the calling test is skipped where it is absent."""
    path = SHARED.joinpath(*parts)
    if not path.exists():
        pytest.skip(f"shared data not here: {'/'.join(parts)}")
    return path
