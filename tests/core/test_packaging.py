"""What is handed out beside the code: file type, desktop entry, guide."""

import shlex
import xml.etree.ElementTree as ET
from pathlib import Path

import pytest

from spinledger.cli.parser import build_parser
from spinledger.project.storage import MIME_TYPE, SUFFIX

PACKAGING = Path(__file__).resolve().parents[2] / "packaging"
SPACE = "{http://www.freedesktop.org/standards/shared-mime-info}"


def test_file_type_is_the_one_that_projects_carry() -> None:
    tree = ET.parse(PACKAGING / "linux" / "spinledger-mime.xml").getroot()
    kind = tree.find(f"{SPACE}mime-type")
    assert kind is not None
    assert kind.attrib["type"] == MIME_TYPE
    glob = kind.find(f"{SPACE}glob")
    assert glob is not None
    assert glob.attrib["pattern"] == f"*{SUFFIX}"
    entry = (PACKAGING / "linux" / "spinledger.desktop").read_text("utf-8")
    assert MIME_TYPE in entry


def guide_commands() -> list[str]:
    """Every command of the guide's blocks, long ones joined to one line."""
    text = (PACKAGING / "docs" / "guide.md").read_text("utf-8")
    blocks = "\n".join(text.split("```")[1::2]).replace("\\\n", " ")
    lines = (line.strip() for line in blocks.splitlines())
    return [line for line in lines if line.startswith("spinledger ")]


def test_guide_shows_commands() -> None:
    assert len(guide_commands()) >= 6


@pytest.mark.parametrize("line", guide_commands())
def test_commands_of_the_guide_are_understood(line: str) -> None:
    words = shlex.split(line, comments=True)[1:]
    assert build_parser().parse_args(words).command == words[0]
