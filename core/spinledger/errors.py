"""The few errors a user can act on; each says in one sentence what is wrong."""

from __future__ import annotations

from pathlib import Path


class SpinLedgerError(Exception):
    """Root of every error the core raises on purpose."""


class FileError(SpinLedgerError):
    """A file or folder is at fault, or cannot be used.

    Attributes
    ----------
    path : pathlib.Path
    reason : str
        One sentence for the user, without the path.
    """

    def __init__(self, path: Path, reason: str) -> None:
        super().__init__(path, reason)  # both in args: survives pickling
        self.path = path
        self.reason = reason

    def __str__(self) -> str:
        return f"{self.path}: {self.reason}"


class SourceError(SpinLedgerError):
    """What was given under a name is at fault.

    Attributes
    ----------
    source : str
    reason : str
        One sentence for the user.
    """

    def __init__(self, source: str, reason: str) -> None:
        super().__init__(source, reason)  # both in args: survives pickling
        self.source = source
        self.reason = reason

    def __str__(self) -> str:
        return f"{self.source}: {self.reason}"


class SpectrumFormatError(FileError, ValueError):
    """A file was read but does not hold a usable 1D proton spectrum.

    Attributes
    ----------
    path : pathlib.Path
        The offending file or dataset folder.
    reason : str
        One sentence for the user, without the path.
    """


class StructureError(SpinLedgerError, ValueError):
    """A structure could not be read or cannot be handled.

    Attributes
    ----------
    given : str
        The text or file name as the user gave it.
    reason : str
        One sentence for the user.
    """

    def __init__(self, given: str, reason: str) -> None:
        super().__init__(given, reason)
        self.given = given
        self.reason = reason

    def __str__(self) -> str:
        return f"{self.given}: {self.reason}"


class EvidenceError(SourceError, ValueError):
    """A spectrum was read but holds nothing that could be compared.

    Attributes
    ----------
    source : str
        Name of the spectrum.
    reason : str
        One sentence for the user.
    """


class OutputError(FileError, OSError):
    """Results could not be written where the user asked.

    Attributes
    ----------
    path : pathlib.Path
        Where writing was tried.
    reason : str
        One sentence for the user.
    """


class UsageError(SpinLedgerError):
    """The command line was called with words it does not know (exit code 2)."""


class CancelledError(SpinLedgerError):
    """The user stopped a long computation; nothing was changed."""


class SideEvidenceError(SourceError, ValueError):
    """Typed or pasted side evidence could not be understood.

    Attributes
    ----------
    source : str
        File name, or "side evidence" where it was typed.
    reason : str
        One sentence for the user.
    """
