"""A summary as a page of text: 80 columns, plain ASCII, fit for a terminal, a mail or a printer."""

from __future__ import annotations

import math
import textwrap
import unicodedata
from datetime import timedelta

from runner.journal.outcome import RunOutcome
from runner.machine.table import Outcome
from runner.report.values import Attempt, Incident, Intervention, Leg, Summary, Totals, TruthScore

WIDTH = 80
LABEL = 16
"""Columns of the labels at the left."""

WRONG_MOST = 10
"""Diagnoses of a simulated run that do not agree with the truth, listed at most."""

LEG_ROW = "{:>4}  {:<20} {:<16} {:<8} {:>7} {:>8} {:>5} {:>4}"


def report_text(summary: Summary) -> str:
    """The whole report, ending in a line break."""
    parts = [_head(summary), _legs(summary), _incidents(summary), _interventions(summary), _totals(summary.totals)]
    if summary.truth is not None:
        parts.append(_truth(summary.truth))
    return "\n\n".join("\n".join(part) for part in parts) + "\n"


def plain(text: str) -> str:
    """Text with accents taken off and whatever is still not ASCII as a question mark."""
    letters = (letter for letter in unicodedata.normalize("NFKD", text) if not unicodedata.combining(letter))
    return "".join(letters).encode("ascii", "replace").decode()


def cut(text: str, width: int) -> str:
    """Plain text of at most `width` characters, with two dots where something was cut off."""
    text = plain(text)
    return text if len(text) <= width else text[: width - 2] + ".."


def span(seconds: float | None) -> str:
    """A duration as M:SS, from an hour on H:MM:SS; a dash where there is none."""
    if seconds is None:
        return "-"
    hours, rest = divmod(round(seconds), 3600)
    return f"{hours}:{rest // 60:02}:{rest % 60:02}" if hours else f"{rest // 60}:{rest % 60:02}"


def way(meters: float | None) -> str:
    """A length in meters, from ten kilometers on in kilometers; a dash where there is none."""
    if meters is None:
        return "-"
    return f"{meters:.1f} m" if meters < 9999.95 else f"{meters / 1000.0:.1f} km"


def _head(summary: Summary) -> list[str]:
    header = summary.header
    lines = [
        ("Run", header.run_id),
        ("Mission", header.mission),
        ("Site", f"{header.site}, with {header.robot}"),
        ("Begins", f"{header.begins:%A %Y-%m-%d %H:%M:%S} at the site"),
        ("Started", f"{header.created:%Y-%m-%d %H:%M:%S} by {header.person} on {header.host}"),
        ("Driven by", f"{header.backend}, seed {header.seed}, conditions {header.conditions}, pace {header.pace}"),
        ("Trundle", header.version),
        ("Outcome", _outcome(summary)),
    ]
    return [line for label, text in lines for line in _labeled(label, text)]


def _outcome(summary: Summary) -> str:
    length, reason = span(summary.totals.seconds), summary.reason
    if summary.outcome is RunOutcome.RUNNING:
        return f"still running, {length} so far: everything below may still change"
    if summary.outcome is RunOutcome.BROKEN_OFF:
        why = f" ({reason})" if reason else ""
        return f"broken off: the record ends after {length} without an end of the mission{why}"
    return f"{summary.outcome.value}, after {length}" + (f": {reason}" if reason else "")


def _legs(summary: Summary) -> list[str]:
    if not summary.legs:
        return ["Legs: none"]
    head = LEG_ROW.format("Leg", "Step", "Place", "Outcome", "Time", "Distance", "Tries", "Rec.")
    rows = [line for leg in summary.legs for line in _leg(leg)]
    return ["Legs (Rec.: recoveries)", head, "-" * WIDTH, *rows]


def _leg(leg: Leg) -> list[str]:
    outcome = leg.outcome.value if leg.outcome else "open"
    done = leg.outcome is not None
    row = LEG_ROW.format(
        leg.number,
        cut(leg.step, 20),
        cut(leg.place, 16),
        outcome,
        span(leg.seconds),
        way(leg.meters),
        leg.tries if done else "-",
        leg.recoveries if done else "-",
    )
    lines = [row]
    if leg.reason and leg.outcome is not Outcome.ARRIVED:
        lines += _wrapped(f"Reason: {leg.reason}", 6)
    if leg.next:
        lines += _wrapped(f"Then:   {leg.next}", 6)
    return lines


def _incidents(summary: Summary) -> list[str]:
    if not summary.incidents:
        return ["Incidents: none"]
    blocks = [_incident(summary, incident) for incident in summary.incidents]
    return ["Incidents"] + [line for block in blocks for line in ("", *block)]


def _incident(summary: Summary, incident: Incident) -> list[str]:
    when = f"{_clock(summary, incident.began)}, {span(incident.began)} after the start"
    lines = [f"Incident {incident.number}: {when}"]
    lines += _labeled("  On", f"leg {incident.leg}, to {incident.destination}")
    lines += _labeled("  Where", _where(incident))
    lines += _labeled("  Sign", incident.sign.value + (f": {incident.detail}" if incident.detail else ""))
    for number, attempt in enumerate(incident.attempts):
        lines += _labeled("" if number else "  Tried", _attempt(summary, attempt))
    if not incident.attempts:
        lines += _labeled("  Tried", "nothing")
    lines += _labeled("  Ended", _how_ended(incident))
    if incident.diagnosis:
        lines += _labeled("  Diagnosis", incident.diagnosis)
        lines += [line for reason in incident.reasons for line in _labeled("", f"- {reason}", hanging=2)]
    return lines


def _where(incident: Incident) -> str:
    if incident.pose is None:
        return "not known"
    at = f"x {incident.pose.x:.2f} m, y {incident.pose.y:.2f} m"
    return f"{incident.near[1]:.1f} m from {incident.near[0]}, at {at}" if incident.near else at


def _attempt(summary: Summary, attempt: Attempt) -> str:
    return f"{_clock(summary, attempt.began)}  {attempt.recovery} (recovery {attempt.rung} of try {attempt.tries})"


def _how_ended(incident: Incident) -> str:
    if incident.recovered is None:
        return "not in this record"
    after = f"after {span(incident.seconds)}"
    if incident.recovered:
        return f"by {incident.ended_by}, {after}"
    return f"without the robot getting on, {after} ({incident.ended_by})"


def _interventions(summary: Summary) -> list[str]:
    if not summary.interventions:
        return ["Interventions: none"]
    return ["Interventions"] + [_intervention(summary, intervention) for intervention in summary.interventions]


def _intervention(summary: Summary, intervention: Intervention) -> str:
    effect = "" if intervention.accepted else " (meant nothing at that moment)"
    who = cut(intervention.who, 24)
    return f"  {_clock(summary, intervention.stamp)}  {intervention.action} by {who}{effect}"


def _totals(totals: Totals) -> list[str]:
    legs = [("arrived", totals.arrived), ("failed", totals.failed)]
    legs += [(word, count) for word, count in (("skipped", totals.skipped), ("aborted", totals.aborted)) if count]
    times = [
        ("driving", totals.driving),
        ("recovering", totals.recovering),
        ("waiting", totals.waiting),
        ("held", totals.held),
    ]
    lines = [
        ("  Legs", ", ".join(f"{count} {word}" for word, count in legs)),
        ("  Incidents", f"{totals.incidents}, of which the robot got out of {totals.recovered} by itself"),
        ("  Interventions", str(totals.interventions)),
        ("  Distance", way(totals.meters)),
        ("  Time", f"{span(totals.seconds)}: " + ", ".join(f"{word} {span(time)}" for word, time in times)),
        ("  Battery", _battery(totals)),
    ]
    return ["Totals"] + [line for label, text in lines for line in _labeled(label, text)]


def _battery(totals: Totals) -> str:
    if totals.battery_first is None or totals.battery_last is None:
        return "not known"
    first, last = 100.0 * totals.battery_first, 100.0 * totals.battery_last
    return f"{first - last:.1f} % used, from {first:.1f} % to {last:.1f} %"


def _truth(truth: TruthScore) -> list[str]:
    """What the simulator knows and the robot did not."""
    told = [score for score in truth.scores if score.right is not None]
    right = sum(score.right is True for score in told)
    lines = [
        (
            "  Diagnoses",
            f"{right} of {len(told)} agree with what really was the case" if told else "none to hold against it",
        )
    ]
    wrong = [score for score in truth.scores if score.right is False]
    for score in wrong[:WRONG_MOST]:
        really = ", ".join(score.really) or "nothing was wrong"
        lines.append((f"  Incident {score.incident}", f"not {score.diagnosis}. Really: {really}"))
    if len(wrong) > WRONG_MOST:
        lines.append(("", f"and {len(wrong) - WRONG_MOST} more that do not agree (see --json)"))
    if (off := truth.whereabouts) is not None:
        lines.append(
            (
                "  Position",
                f"off by {100.0 * off.mean:.1f} cm on average, under {100.0 * off.most_of:.1f} cm in 95 of 100"
                f" readings, {100.0 * off.most:.1f} cm at most",
            )
        )
        degrees = math.degrees(off.heading_mean), math.degrees(off.heading_most_of)
        lines.append(("  Heading", f"off by {degrees[0]:.1f} deg on average, under {degrees[1]:.1f} deg in 95 of 100"))
    return ["Truth (of a simulated run; the robot did not know it)"] + [
        line for label, text in lines for line in _labeled(label, text)
    ]


def _clock(summary: Summary, stamp: float) -> str:
    """The site's time of day at a stamp."""
    return f"{summary.header.begins + timedelta(seconds=stamp):%H:%M:%S}"


def _labeled(label: str, text: str, hanging: int = 0) -> list[str]:
    """A label and its text, wrapped so that the text stays in its column, all but its first line `hanging` deeper."""
    lines = textwrap.wrap(plain(text), WIDTH - LABEL, subsequent_indent=" " * hanging) or [""]
    return [f"{name:<{LABEL}}{line}".rstrip() for name, line in zip([label, *[""] * len(lines)], lines, strict=False)]


def _wrapped(text: str, indent: int) -> list[str]:
    return textwrap.wrap(plain(text), WIDTH, initial_indent=" " * indent, subsequent_indent=" " * (indent + 8))
