"""Both answers to "how much": content of the compound, and what else is there."""

from __future__ import annotations

from dataclasses import dataclass

from spinledger.quantity.content import Content
from spinledger.quantity.purity import Purity


@dataclass(frozen=True, slots=True, kw_only=True)
class Quantity:
    """What a report prints; ``purity`` is None where nothing was weighed in."""

    content: Content
    purity: Purity | None = None
