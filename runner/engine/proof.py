"""Whether a claim about the share of legs that arrive is proved, by a test that may be looked at after every leg.

The claim "at least a share p0 of legs arrive" is proved at confidence c when the chance of ever seeing evidence this
strong, were the share p0 or less, is at most 1 - c, however often one looks. The evidence is a likelihood ratio: the
legs seen, averaged over shares spread evenly between p0 and 1, against p0. By Ville's inequality (1939) it exceeds
1 / (1 - c) with a chance of at most 1 - c; tests of this form are due to Wald (1945) and Robbins (1970). It needs more
legs than a plan with their number fixed beforehand: the price for looking on the way.
"""

from __future__ import annotations

from math import exp, lgamma, log, log1p


def proven(arrived: int, failed: int, share: float, confidence: float) -> bool:
    """Whether so many legs prove that at least `share` (between 0 and 1) arrive, at `confidence`."""
    total = arrived + failed
    if total == 0 or arrived <= share * total:
        return False
    return log_evidence(arrived, failed, share) >= -log1p(-confidence)


def log_evidence(arrived: int, failed: int, share: float) -> float:
    """The natural logarithm of the likelihood ratio: even mixture over (share, 1) against `share`."""
    total = arrived + failed
    mixture = log_beta(arrived + 1, failed + 1) + _log_upper_tail(arrived + 1, failed + 1, share) - log1p(-share)
    return mixture - arrived * log(share) - (total - arrived) * log1p(-share)


def log_beta(a: float, b: float) -> float:
    """The logarithm of Euler's beta function."""
    return lgamma(a) + lgamma(b) - lgamma(a + b)


def _log_upper_tail(a: int, b: int, x: float) -> float:
    """log of 1 - I_x(a, b) for whole a and b: the chance that fewer than a of a + b - 1 trials succeed at x.

    By its opposite, which has only b terms. It is asked for only where more legs arrived than the claim's share, so
    the opposite is at most about a half and nothing is lost.
    """
    trials = a + b - 1
    opposite = sum(exp(_log_binomial(trials, k) + k * log(x) + (trials - k) * log1p(-x)) for k in range(a, trials + 1))
    return log1p(-min(opposite, 1.0 - 1e-12))


def _log_binomial(n: int, k: int) -> float:
    return lgamma(n + 1) - lgamma(k + 1) - lgamma(n - k + 1)
