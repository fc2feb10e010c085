"""The border to nmrglue: its faults on damaged files become one plain sentence."""

from __future__ import annotations

import struct
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from spinledger.errors import SpectrumFormatError

# What nmrglue 0.12 was seen to raise on damaged files.
_FAULTS = (
    ArithmeticError,
    AssertionError,
    AttributeError,
    LookupError,
    NotImplementedError,
    OSError,
    TypeError,
    ValueError,
    struct.error,
)


@contextmanager
def vendor_border(path: Path) -> Iterator[None]:
    """Turn what nmrglue raises inside into a SpectrumFormatError.

    nmrglue's own warnings are silenced: what they tell of is checked by the
    readers, and ends as an error or as a note.
    """
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            yield
    except SpectrumFormatError:
        raise
    except _FAULTS as fault:
        raise SpectrumFormatError(
            path, "is damaged and cannot be read; copy or export it again"
        ) from fault
