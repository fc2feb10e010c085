"""Multiplicities in the words of the journals."""

from __future__ import annotations

from collections.abc import Sequence

_NAMES = {1: "d", 2: "t", 3: "q", 4: "quint", 5: "sext", 6: "sept"}
_MOST_LEVELS = 4


def multiplicity_of(
    levels: Sequence[tuple[int, bool]],
    *,
    is_first_order: bool,
    spin_system: str | None = None,
) -> str:
    """Multiplicity text of a splitting tree.

    Parameters
    ----------
    levels : sequence of (int, bool)
        Number of partner spins of each level, largest J first, and whether
        different couplings coincide in it by accident.
    is_first_order : bool
    spin_system : str, optional
        Said beside "m" where the claim is half of an AA'XX' or AA'BB' system.

    Returns
    -------
    str
        "s", "d", "dd", "dt", "quint", "app t", "m", "m (AA'XX')", ...

    Examples
    --------
    >>> multiplicity_of([(1, False), (2, False)], is_first_order=True)
    'dt'
    >>> multiplicity_of([(2, True)], is_first_order=True)
    'app t'
    """
    if not is_first_order:
        return "m" if spin_system is None else f"m ({spin_system})"
    if not levels:
        return "s"
    if len(levels) > _MOST_LEVELS or any(n not in _NAMES for n, _ in levels):
        return "m"
    names = [_NAMES[n] for n, _ in levels]
    joiner = "" if all(len(name) == 1 for name in names) else " "
    text = joiner.join(names)
    return f"app {text}" if any(accidental for _, accidental in levels) else text
