from pathlib import Path

import pytest

from spinledger.cli import main
from spinledger.cli.mixture import components_of
from spinledger.cli.sample import roles_of
from spinledger.errors import UsageError


def test_roles_are_given_in_the_order_of_the_spectra() -> None:
    assert roles_of(None, 2) == (None, None)
    assert roles_of("main, shake,guess", 3) == ("main", "D2O shake", None)
    with pytest.raises(UsageError, match="'witness' is not known"):
        roles_of("main,witness", 2)
    with pytest.raises(UsageError, match="1 roles for 2 spectra"):
        roles_of("main", 2)


def test_components_name_their_part(tmp_path: Path) -> None:
    path = tmp_path / "parts.smi"
    path.write_text("CC(C)=O sm: ketone\nCC(C)O alcohol\nO by-product: water\n")
    found = components_of(path)
    assert [(one.name, one.part) for one in found] == [
        ("ketone", "starting material"),
        ("alcohol", "product"),
        ("water", "by-product"),
    ]


def test_single_component_is_refused_in_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "parts.smi"
    path.write_text("CC(C)O alcohol\n")
    words = ["mixture", "x", "--components", str(path), "--out", str(tmp_path / "o")]
    assert main(words) == 1
    assert "two or more components" in capsys.readouterr().err


def test_library_wants_one_thing_at_a_time(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["library", str(tmp_path)]) == 2
    assert "give one of" in capsys.readouterr().err
    assert main(["library", str(tmp_path / "none"), "--near", "CCO"]) == 1
    assert "no such library folder" in capsys.readouterr().err
