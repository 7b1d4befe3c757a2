"""How often each mistake is made, before anything is known of the case: the one table of priors of the catalogue.

Only ratios count: odds compare the mistakes that could have been made of one suspect with each other and with "none of
them". The figures are a guess of the trade, no source: copying digits and booking the wrong mark come first in every
office's list, units and signs less often, because a whole table is mostly wrong then. The table of
docs/validation-mistakes.md shows how little comes of it when every figure is three times off.
"""

from __future__ import annotations

PRIORS: dict[str, float] = {
    "digits exchanged": 10.0,
    "digit misread": 10.0,
    "another mark": 10.0,
    "staff misread": 8.0,
    "antenna height": 8.0,
    "whole angle miscounted": 6.0,
    "target constant": 6.0,
    "sign": 6.0,
    "from and to exchanged": 6.0,
    "back and fore exchanged": 6.0,
    "dropped tape or whole metres": 5.0,
    "height missing": 5.0,
    "other face": 4.0,
    "slope as horizontal": 4.0,
    "axes exchanged": 4.0,
    "metres and feet": 3.0,
    "weather correction": 3.0,
    "heights exchanged": 3.0,
    "height of another setup": 3.0,
    "degrees and gon": 2.0,
    "circle counted otherwise": 2.0,
}
NO_COMMON_MISTAKE = 20.0
"""Of everything that the catalogue does not hold."""
ORDERS_OF_SIZE = 1e5
"""Errors of no common mistake may be as small as one standard deviation or so many times as large, every order of size
as likely as the next."""
