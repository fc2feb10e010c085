"""Side evidence on the command line: a fault is one sentence before any work."""

from pathlib import Path

import pytest

from spinledger.cli import main


@pytest.mark.parametrize(
    ("side", "fault"),
    [
        ("COSY: 4.12", "line 1: '4.12' is no pair"),
        ("no-such-file.txt", "the side evidence could not be read"),
    ],
)
def test_a_fault_in_the_side_evidence_is_said_at_once(
    side: str, fault: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out = tmp_path / "out"
    words = ["reconcile", str(tmp_path), "--structure", "CCO", "--out", str(out)]
    assert main([*words, "--side", side]) == 1
    assert fault in capsys.readouterr().err
    assert not out.exists()
