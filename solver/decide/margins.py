"""A requirement, what the aircraft reaches, and the verdict.

A requirement that the nominal value misses fails. One that is met, but not at
the worse end of the band or on data that cannot carry it, is to be watched.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

PASS, WATCH, FAIL = "pass", "watch", "fail"


@dataclass(frozen=True)
class Requirement:
    """What is asked for.

    Fields
    ------
    key, label : str
        Stable name and the words for it.
    limit : float
        In `unit`.
    sense : str
        ``"at least"`` or ``"at most"``.
    unit : str
        Empty for a ratio.
    decimals : int
        Digits after the point when it is put in words.
    """

    key: str
    label: str
    limit: float
    sense: str
    unit: str
    decimals: int

    def met_by(self, value: float) -> bool:
        """Whether a value, in the requirement's unit, meets the limit."""
        return value >= self.limit if self.sense == "at least" else value <= self.limit

    def words(self, value: float) -> str:
        """Put a value into words with its unit."""
        gap = "" if self.unit in ("", "%") else " "
        unit = " %" if self.unit == "%" else self.unit
        number = f"{value:.{self.decimals}f}".replace("-", "−")
        return f"{number}{gap}{unit}"


@dataclass(frozen=True)
class Judgement:
    """The answer to one requirement.

    Fields
    ------
    requirement : Requirement
    value, low, high : float
        Nominal value and band, in the requirement's unit; NaN where not found.
    verdict : str
        ``"pass"``, ``"watch"`` or ``"fail"``.
    reason : str
    """

    requirement: Requirement
    value: float
    low: float
    high: float
    verdict: str
    reason: str


def judge(
    requirement: Requirement,
    value: float,
    *,
    low: float | None = None,
    high: float | None = None,
    doubts: tuple[str, ...] = (),
    explanation: str = "",
    missing: str = "",
) -> Judgement:
    """Give a verdict and say why.

    Parameters
    ----------
    requirement : Requirement
    value : float
        Nominal, in the requirement's unit. NaN where it could not be found.
    low, high : float, optional
        Band about it; none means the value has no band of its own.
    doubts : tuple of str
        Sentences, each of which forbids a "pass" by itself.
    explanation : str
        Sentences on what causes a miss, put after the statement of it.
    missing : str
        Why there is no value, for a NaN.

    Returns
    -------
    Judgement
    """
    if math.isnan(value):
        reason = missing or "It could not be found."
        return Judgement(requirement, value, value, value, FAIL, reason)
    low = value if low is None else low
    high = value if high is None else high
    worse = low if requirement.sense == "at least" else high
    verdict, reason = _verdict(requirement, value, worse, doubts)
    tail = f" {explanation}" if explanation and verdict != PASS else ""
    return Judgement(requirement, value, low, high, verdict, reason + tail)


def _verdict(
    requirement: Requirement, value: float, worse: float, doubts: tuple[str, ...]
) -> tuple[str, str]:
    words = requirement.words
    asked = f"{requirement.sense} {words(requirement.limit)}"
    if not requirement.met_by(value):
        return FAIL, f"{words(value)} where {asked} is asked for."
    parts = []
    if not requirement.met_by(worse):
        parts.append(
            f"Met at {words(value)}, but the worse end of the band, {words(worse)}, "
            f"misses {words(requirement.limit)}."
        )
    parts.extend(doubts)
    if parts:
        return WATCH, " ".join(parts)
    return PASS, f"{words(value)} where {asked} is asked for."
