"""Whether a pulse program suppresses water, by its name."""

from __future__ import annotations

import re

# Names of the makers' libraries and of common home-made ones; trade knowledge:
# "pr" is presaturation, "esgp" excitation sculpting, "gpw5" and "p3919" WATERGATE.
_SUPPRESSION = re.compile(
    r"presat|zg\w*pr|noesy\w*pr|cpmg\w*pr|led\w*pr|cppr|stebp\w*pr|esgp|esfp|p3919"
    r"|gpw5|(^|_|zg|gp)wet|w(ater)?_?gate|water_?sup|wsup|metnoesy|tnnoesy"
    r"|purge|robust-?5|sculpt|dpfgse_?w|jump_?return|(^|_)p11"
)


def is_presaturated(pulse_program: str | None) -> bool:
    """Whether a pulse program's name says that water is irradiated or suppressed.

    Examples
    --------
    >>> is_presaturated("zgcppr"), is_presaturated("zg30"), is_presaturated(None)
    (True, False, False)
    """
    if pulse_program is None:
        return False
    return _SUPPRESSION.search(pulse_program.lower()) is not None
