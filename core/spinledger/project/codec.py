"""Frozen values to plain JSON and arrays, and back, by a closed list of classes."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from types import ModuleType
from typing import Any

import numpy as np
import numpy.typing as npt

from spinledger.project import document, edits
from spinledger.values import (
    acquisition,
    claim,
    evidence,
    geometry,
    ledger,
    recipe,
    spectrum,
    structure,
)

_KIND = "$"
_ARRAY = "array"
_NUMBER = "number"
_MODULES: tuple[ModuleType, ...] = (
    acquisition,
    claim,
    evidence,
    geometry,
    ledger,
    recipe,
    spectrum,
    structure,
    document,
    edits,
)
_CLASSES: Mapping[str, type[Any]] = {
    name: kind
    for module in _MODULES
    for name, kind in vars(module).items()
    if isinstance(kind, type)
    and is_dataclass(kind)
    and kind.__module__ == module.__name__
}


class Encoder:
    """Turns values into JSON trees and gathers their arrays under names.

    Attributes
    ----------
    arrays : dict of str to numpy.ndarray
        Every array met; one that is met twice is stored once.
    """

    def __init__(self) -> None:
        self.arrays: dict[str, npt.NDArray[Any]] = {}
        self._names: dict[int, str] = {}

    def encode(self, value: Any) -> Any:
        """JSON tree of a value.

        Raises
        ------
        TypeError
            If something is neither plain nor one of the known frozen values.
        """
        if value is None or isinstance(value, bool | str):
            return value
        if isinstance(value, np.bool_):
            return bool(value)
        if isinstance(value, int | np.integer):
            return int(value)
        if isinstance(value, float | np.floating):
            return _encode_float(float(value))
        if isinstance(value, np.ndarray):
            return {_KIND: _ARRAY, "name": self._name(value)}
        if isinstance(value, tuple | list):
            return [self.encode(item) for item in value]
        if _CLASSES.get(type(value).__name__) is type(value):
            return self._encode_fields(value)
        raise TypeError(f"value: cannot be saved, got {type(value).__name__}")

    def _encode_fields(self, value: Any) -> dict[str, Any]:
        tree: dict[str, Any] = {_KIND: type(value).__name__}
        for field in fields(value):
            tree[field.name] = self.encode(getattr(value, field.name))
        return tree

    def _name(self, array: npt.NDArray[Any]) -> str:
        name = self._names.get(id(array))
        if name is None:
            name = f"{len(self.arrays) + 1:04d}"
            self._names[id(array)] = name
            self.arrays[name] = array
        return name


def decode(tree: Any, arrays: Mapping[str, npt.NDArray[Any]]) -> Any:
    """Value from a JSON tree; lists come back as tuples.

    Fields that a newer version wrote and this one does not know are passed
    over; fields that an older version did not write take their default.

    Raises
    ------
    ValueError
        If a class or an array is unknown, or a value breaks its own rules.
    """
    if isinstance(tree, list):
        return tuple(decode(item, arrays) for item in tree)
    if not isinstance(tree, dict):
        return tree
    kind = tree.get(_KIND)
    if kind == _NUMBER:
        return float(tree["value"])
    if kind == _ARRAY:
        return _array(tree, arrays)
    if kind not in _CLASSES:
        raise ValueError(f"unknown value {kind!r}")
    return _decode_fields(_CLASSES[str(kind)], tree, arrays)


def _array(
    tree: dict[str, Any], arrays: Mapping[str, npt.NDArray[Any]]
) -> npt.NDArray[Any]:
    name = tree.get("name")
    if name not in arrays:
        raise ValueError(f"array {name!r} is missing")
    return arrays[str(name)]


def _decode_fields(
    kind: type[Any], tree: dict[str, Any], arrays: Mapping[str, npt.NDArray[Any]]
) -> Any:
    known = {field.name for field in fields(kind)}
    given = {key: decode(item, arrays) for key, item in tree.items() if key in known}
    try:
        return kind(**given)
    except TypeError as error:
        raise ValueError(f"{kind.__name__}: {error}") from error


def _encode_float(value: float) -> Any:
    if math.isfinite(value):
        return value
    return {_KIND: _NUMBER, "value": repr(value)}
