"""A mission that uses every construct of the language, and the file it includes."""

from __future__ import annotations

SHARED = """\
shared: House rules
retry rules:
  hasty: {tries: 1, recover: [replan], give up after: 2 min}
routines:
  knock:
    given: [room, who]
    steps:
      - notify: "{who} is at {room}"
      - go: room
        rule: hasty
        otherwise: skip
"""

MISSION = """\
mission: Everything
site: floor.yaml
robot: cart.yaml
start: ward east
include: [shared.yaml]
silence: [unused-rule]
retry rules:
  patient:
    tries: 3
    rest between tries: 20 s, doubling to 2 min
    stalled when: under 0.3 m of progress in 12 s
    recover: [replan, clear 3 m, ease back 0.4 m, rest 30 s, relocate]
    give up after: 8 min
limits: {speed: 0.8 m/s, end by: 06:00}
prove: {legs arrive: 95 %, confidence: 90 %}
standing orders:
  - name: low battery
    when: battery < 20 % for 10 s
    do:
      - charge: {at: ward east, until: battery >= 70 %, up to: 2 h, rule: patient, otherwise: skip}
    then: carry on
  - name: enough
    when: trays taken >= 40 or last leg failed and elapsed > 9 h
    do: [notify: "That is enough."]
    then: end
  - {name: anew, when: not (clock < 23:00), do: [wait: 1 min], then: repeat step}
routines:
  hand over:
    given: [room]
    steps:
      - go: room
        rule: patient
        within: 4 min
        otherwise:
          - run: knock
            with: {room: room, who: the cart}
      - ask: "Tray taken at {room}?"
        answers: [yes, no, come back later]
        up to: 90 s
        if silent: no
      - when: answer is yes
        then:
          - count: trays taken
            by: 2
        else: [notify: "{{nobody}} was at {room}"]
  both:
    given: [one, other]
    steps:
      - visit: [one, other]
        order: nearest
        each: hand over
steps:
  - go: {x: 3 m, y: 4.5 m, facing: north}
  - go: ahead 1 m
    otherwise: skip
  - repeat:
      until: proven or clock >= 05:30
      every: 30 min
      if a lap overruns: next interval
      steps:
        - visit: [ward east, laboratory]
          order: shuffled
          rule: patient
          within: 4 min
          otherwise: end
        - run: both
          with: {one: laboratory, other: ward east}
        - when: laps >= 3 and not answer is come back later
          then: [wait: 2 min]
  - repeat: {times: 3, steps: [go: laboratory, wait: {until: 05:45, up to: 1 min}]}
  - repeat: {for: 2 h, steps: [wait: {until: last leg arrived for 5 s, up to: 1 min, otherwise: [go: ward east]}]}
  - end: failed
    because: the night was too short
"""
