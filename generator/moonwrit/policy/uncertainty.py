"""When a margin is smaller than what is known of the Earth's rotation."""

from __future__ import annotations

from datetime import date
from math import sqrt

from moonwrit.policy.months import Margin, Note

_KNOWN_UNTIL = 2026


_PAST = ((1900, 0.1), (1800, 1.0), (1750, 2.0), (1700, 5.0), (1600, 20.0))
"""From that year on, the standard error in seconds: L. V. Morrison and F. R. Stephenson 2004, as tabulated with
Espenak's eclipse canons; from memory. Before 1600: the same 20 s."""


def delta_t_error_s(year: float) -> float:
    """Standard error of delta-T in seconds, for years before and after those measured.

    365.25 N sqrt(N Q/3 (1 + N/M)) / 1000 with Q = 0.058 ms2/yr, M = 2500 yr, N years from the last measured:
    P. Huber 2006, as used in F. Espenak's eclipse canons; from memory. From 1900 to then: 0.1 s, generously.
    """
    n = year - _KNOWN_UNTIL
    if n <= 0:
        return next((error for since, error in _PAST if year >= since), _PAST[-1][1])
    return max(0.1, 365.25 * n * sqrt(n * 0.058 / 3 * (1 + n / 2500)) / 1000)


def uncertainty_note(margin: Margin, starts: date) -> tuple[Note, ...]:
    """A note where the margin, as time, is within two standard errors of delta-T.

    A quantity moves by ``day_share`` of its daily change in that share of a day, so both compare as time.
    The ephemeris itself (DE421 against DE440: 0.012 s in the conjunction, 1900-2053) is far below this.
    """
    if margin.day_share is None:
        return ()
    error = delta_t_error_s(starts.year)
    if abs(margin.day_share) * 86400 > 2 * error:
        return ()
    return (Note(
        "The margin is smaller than the uncertainty of the Earth's rotation in that year (about %(seconds)s s).",
        {"seconds": round(error, 1)},
    ),)
