"""Tests of the bench run without a display; helpers lie beside them."""

import os
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
sys.path.insert(0, str(Path(__file__).parent))

import invented
from stage import put_on, stage, take_down

from spinledger_app.application import Parts


@pytest.fixture
def parts(qapp: object, tmp_path: Path) -> Iterator[Parts]:
    """A window on the invented project and its ledger."""
    made = stage(tmp_path)
    put_on(made, invented.ledger())
    yield made
    take_down(made)
