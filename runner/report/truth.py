"""How well a simulated run was understood: its diagnoses, and where the robot believed to be, held against the truth.

A diagnosis is right where it agrees with something that really was the case, for a good part of the trouble, from a
little before its first sign to its end. Only records of simulated runs hold the truth.
"""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Iterable, Sequence
from itertools import chain, pairwise

from runner.journal.reader import TrackRow, TruthRow
from runner.report.values import Incident, Score, TruthScore, Whereabouts

LEAD_S = 15.0
"""A sign of trouble comes so long after the trouble at most: the window in which progress is looked for."""
GOOD_PART = 0.1
"""Of the time in trouble for which there was any cause: a cause that held for less is not what it was about."""
APART_S = 1.0
"""Between two readings of telemetry farther apart than this nothing is known of where the robot believed to be."""

IN_THE_WAY = frozenset(
    {"person in the way", "carton in the way", "door shut", "furniture in the way", "gap too narrow"}
)
AGREEING: dict[str, frozenset[str]] = {
    "robot refused": frozenset({"battery empty"}),
    "robot failed": frozenset({"battery empty", "wheels stuck", "not where it believes", "carried", "lidar blind"}),
    "robot halted by itself": frozenset({"emergency stop"}),
    "remembered obstacle that was gone": frozenset({"remembered obstacle that is gone"}),
    "blocked by something that moved off": frozenset({"person in the way", "carton in the way", "door shut"}),
    "blocked by people": frozenset({"person in the way"}),
    "route blocked": IN_THE_WAY,
    "gap too narrow": frozenset({"gap too narrow", "carton in the way", "furniture in the way"}),
    "lost": frozenset({"carried", "not where it believes"}),
    "wheel trouble": frozenset({"wheels stuck", "slip", "emergency stop"}),
    "link": frozenset({"silent"}),
    "battery": frozenset({"battery empty"}),
    "unknown": frozenset({""}),
}
"""What may really be the case where a diagnosis is right. A diagnosis that is not listed is not scored."""


def truth_score(
    incidents: Sequence[Incident], truths: Iterable[TruthRow], track: Iterable[TrackRow]
) -> TruthScore | None:
    """Diagnoses and beliefs of a run against the truth; None where the record holds none."""
    known = list(truths)
    if not known:
        return None
    scores = tuple(_score(incident, known) for incident in incidents if incident.diagnosis)
    return TruthScore(scores, whereabouts(known, track))


def _score(incident: Incident, truths: Sequence[TruthRow]) -> Score:
    ends = incident.began + (incident.seconds or 0.0)
    lasted = _lasted(truths, incident.began - LEAD_S, ends)
    caused = {cause: seconds for cause, seconds in lasted.items() if cause}
    total = sum(caused.values())
    really = tuple(sorted((c for c in caused if caused[c] >= GOOD_PART * total), key=lambda c: (-caused[c], c)))
    agreeing = AGREEING.get(incident.diagnosis)
    right = None if agreeing is None else not agreeing.isdisjoint(really or ("",))
    return Score(incident.number, incident.diagnosis, really, right)


def _lasted(truths: Sequence[TruthRow], begins: float, ends: float) -> dict[str, float]:
    """For how many seconds of a span each cause held; each holds until the next truth."""
    lasted: dict[str, float] = {}
    for truth, following in pairwise(chain(truths, [None])):
        if truth is None:
            break
        until = ends if following is None else following.stamp
        seconds = min(until, ends) - max(truth.stamp, begins)
        if seconds > 0.0:
            lasted[truth.cause] = lasted.get(truth.cause, 0.0) + seconds
    return lasted


def whereabouts(truths: Iterable[TruthRow], track: Iterable[TrackRow]) -> Whereabouts | None:
    """How far the believed pose was off the true one, at the stamps of the truths; None where nothing can be compared.

    Between two readings of telemetry the belief is taken to change evenly.
    """
    seen = [row.seen for row in track]
    stamps = [one.stamp for one in seen]
    off: list[float] = []
    turned: list[float] = []
    for truth in truths:
        after = bisect_right(stamps, truth.stamp)
        if not 0 < after < len(seen) or stamps[after] - stamps[after - 1] > APART_S + 0.01:
            continue
        early, late = seen[after - 1].pose, seen[after].pose
        share = (truth.stamp - stamps[after - 1]) / (stamps[after] - stamps[after - 1])
        x, y = early.x + share * (late.x - early.x), early.y + share * (late.y - early.y)
        heading = early.heading + share * math.remainder(late.heading - early.heading, 2.0 * math.pi)
        off.append(math.hypot(x - truth.pose.x, y - truth.pose.y))
        turned.append(abs(math.remainder(heading - truth.pose.heading, 2.0 * math.pi)))
    if not off:
        return None
    return Whereabouts(
        readings=len(off),
        mean=sum(off) / len(off),
        most_of=_share_of(off, 0.95),
        most=max(off),
        heading_mean=sum(turned) / len(turned),
        heading_most_of=_share_of(turned, 0.95),
    )


def _share_of(values: Sequence[float], share: float) -> float:
    """The smallest value that so large a share of all do not exceed."""
    return sorted(values)[max(0, math.ceil(share * len(values)) - 1)]
