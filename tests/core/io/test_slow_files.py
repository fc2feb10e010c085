"""Data on a slow network share: every file is opened a few times at most.

On such a share an open costs tens of milliseconds and a read of the whole file
seconds, so what counts is how often a file is asked for. Looking at its content,
listing it, hashing it and reading it are four; a fifth would be a file read twice
for the same purpose.
"""

import json
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from instrument_files import (
    jcamp_fid_text,
    write_bruker,
    write_jeol,
    write_nmrml,
    write_varian,
)

MOST_OPENS = 4
#: Counts opens below a folder, each delayed as by a far server.
COUNTING = """
import json, sys, time
from collections import Counter
from pathlib import Path
from spinledger.io.read import read_acquired
place, opens = Path(sys.argv[1]), Counter()
def hook(event, args):
    if event == "open" and str(args[0]).startswith(str(place)):
        time.sleep(0.02)
        opens[str(args[0])] += 1
sys.addaudithook(hook)
acquired = read_acquired(place)
print(json.dumps({"opens": opens, "format": acquired.metadata.format_name}))
"""


def _jcamp(folder: Path) -> None:
    folder.mkdir()
    (folder / "1h.fid.dx").write_text(jcamp_fid_text(), encoding="utf-8")


def _jeol(folder: Path) -> None:
    folder.mkdir()
    write_jeol(folder / "sample.jdf")


def _nmrml(folder: Path) -> None:
    folder.mkdir()
    write_nmrml(folder / "sample.nmrML")


@pytest.mark.parametrize(
    "write",
    [write_bruker, write_varian, _jcamp, _jeol, _nmrml],
    ids=lambda f: f.__name__,
)
def test_no_file_is_asked_for_again_and_again(
    write: Callable[[Path], object], tmp_path: Path
) -> None:
    place = tmp_path / "share"
    write(place)
    run = subprocess.run(
        [sys.executable, "-c", COUNTING, str(place)],
        check=True,
        capture_output=True,
        text=True,
        env=os.environ | {"PYTHONPATH": os.pathsep.join(sys.path)},
    )
    opens = json.loads(run.stdout)["opens"]
    assert opens, "nothing was opened below the folder"
    assert max(opens.values()) <= MOST_OPENS, opens
