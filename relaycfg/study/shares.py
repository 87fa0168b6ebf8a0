"""Shares of modelled load states with their Wilson intervals."""

import math

from relaycfg.model.break_results import Share

Z_95 = 1.959963984540054
"""Two-sided 95 percent point of the normal distribution."""


def share(count: int, of: int) -> Share:
    """``count`` of ``of`` states with the 95 percent Wilson score interval.

    Source: E. B. Wilson, Probable inference, the law of succession, and statistical inference, JASA 22, 1927 (from
    memory). Zero hits keep an upper end near 3/n to 4/n.
    """
    if of == 0:
        return Share(0, 0, 0.0, 1.0)
    p = count / of
    spread = Z_95**2 / of
    centre = (p + spread / 2) / (1 + spread)
    half = Z_95 * math.sqrt(p * (1 - p) / of + spread / (4 * of)) / (1 + spread)
    return Share(count, of, max(0.0, centre - half), min(1.0, centre + half))
