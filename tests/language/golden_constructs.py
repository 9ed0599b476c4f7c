"""Golden diagnostics of mistakes in steps, routines, standing orders and what else a mission says at its top."""

from __future__ import annotations

from tests.language.golden import Case

IN_CONSTRUCTS = (
    Case(
        "a move without a length",
        "steps:\n  - go: ahead\n",
        (6, 9, 5),
        '"ahead" needs a length.',
        "Write for example ahead 3 m.",
    ),
    Case(
        "a move without a unit",
        "steps:\n  - go: ahead 3\n",
        (6, 15, 1),
        "A length needs a unit.",
        "Write 3 m, 3 cm or 3 mm.",
    ),
    Case(
        "a move across the floor",
        "steps:\n  - go: back 300 m\n",
        (6, 14, 5),
        "A move cannot be 300 m.",
        "Write something from 5 cm to 50 m.",
    ),
    Case(
        "a pose without a facing",
        "steps:\n  - go: {x: 3 m, y: 4 m}\n",
        (6, 9, 16),
        'A pose needs "facing".',
        "Add for example: facing: 90 deg",
    ),
    Case(
        "a pose beyond the floor",
        "steps:\n  - go: {x: 30 m, y: 4 m, facing: east}\n",
        (6, 9, 31),
        "This pose lies beyond the floor.",
        'The floor of "Test floor" is 20 m x 10 m from 0, 0.',
    ),
    Case(
        "a pose without units",
        "steps:\n  - go: {x: 3, y: 4 m, facing: east}\n",
        (6, 13, 1),
        "A length needs a unit.",
        "Write 3 m, 3 cm or 3 mm.",
    ),
    Case(
        "a direction that is none",
        "steps:\n  - go: {x: 3 m, y: 4 m, facing: up}\n",
        (6, 34, 2),
        "This is no direction.",
        "Write east, north, west, south, or an angle such as 90 deg.",
    ),
    Case(
        "an order that is not there",
        "steps:\n  - visit: [ward east]\n    order: shortes\n",
        (7, 12, 7),
        'There is no order called "shortes".',
        'The nearest order is "shortest".',
    ),
    Case(
        "each with a rule beside it",
        "routines:\n"
        "  knock: {given: [room], steps: [go: room]}\n"
        "steps:\n"
        "  - visit: [ward east]\n"
        "    each: knock\n"
        "    within: 4 min\n",
        (10, 5, 6),
        'With "each" the routine drives, so "within" has no effect here.',
        "Write within at the go inside the routine.",
    ),
    Case(
        "each with a routine of two parameters",
        "routines:\n"
        '  knock: {given: [room, who], steps: [go: room, notify: "{who}"]}\n'
        "steps:\n"
        "  - visit: [ward east]\n"
        "    each: knock\n",
        (9, 11, 5),
        'The routine "knock" has 2 parameters, but each place is given as one.',
        "Name a routine with one parameter, for example given: [room].",
    ),
    Case(
        "each with a routine that is not there",
        "routines:\n  knock: {given: [room], steps: [go: room]}\nsteps:\n  - visit: [ward east]\n    each: knok\n",
        (9, 11, 4),
        'There is no routine called "knok".',
        'The nearest routine is "knock".',
    ),
    Case(
        "a wait for a clock time",
        "steps:\n  - wait: 18:30\n",
        (6, 11, 5),
        "A wait lasts a time; this is a clock time.",
        "Write wait: {until: 18:30}",
    ),
    Case(
        "a wait in vain without a bound",
        "steps:\n  - wait: {until: battery > 50 %, otherwise: skip}\n",
        (6, 35, 9),
        '"otherwise" follows when a time is over, but there is none.',
        "Add for example up to: 10 min",
    ),
    Case(
        "a wait for nothing",
        "steps:\n  - wait: {up to: 5 min}\n",
        (6, 11, 14),
        'The step wait needs "until".',
        "Add for example: until: battery >= 50 %",
    ),
    Case(
        "a question without answers",
        "steps:\n  - {ask: Well, up to: 1 min, if silent: no}\n",
        (6, 5, 40),
        'The step ask needs "answers".',
        "Add for example: answers: [yes, no]",
    ),
    Case(
        "an answer offered twice",
        "steps:\n  - {ask: Well, answers: [yes, Yes], up to: 1 min, if silent: yes}\n",
        (6, 32, 3),
        'The answer "Yes" is offered twice.',
        "Keep one of the two.",
    ),
    Case(
        "a silence that is no answer",
        "steps:\n  - {ask: Well, answers: [yes, no], up to: 1 min, if silent: not}\n",
        (6, 62, 3),
        '"not" is not among the answers.',
        'The nearest answer is "no".',
    ),
    Case(
        "a parameter in a question outside routines",
        'steps:\n  - {ask: "At {room}", answers: [yes], up to: 1 min, if silent: yes}\n',
        (6, 15, 6),
        '"{room}" stands for a parameter, but here is no routine.',
        "Write the word itself; for a brace in a text write {{ or }}.",
    ),
    Case(
        "a brace without a partner",
        'steps:\n  - notify: "a } b"\n',
        (6, 16, 1),
        "This brace has no partner.",
        "For a brace in a text write it twice: {{ or }}.",
    ),
    Case(
        "a charge that never ends",
        "steps:\n  - charge: {at: ward east}\n",
        (6, 13, 15),
        'The step charge needs "until".',
        "Add for example: until: battery >= 70 %",
    ),
    Case(
        "a charge in no mapping",
        "steps:\n  - charge: ward east\n",
        (6, 13, 9),
        "Keys and values are meant for charge.",
        "Write for example {at: charging bay, until: battery >= 70 %}.",
    ),
    Case(
        "overrunning without an interval",
        "steps:\n  - repeat: {times: 2, if a lap overruns: at once, steps: [wait: 1 s]}\n",
        (6, 24, 17),
        "Only laps at an interval can overrun it.",
        "Add for example every: 30 min",
    ),
    Case(
        "a late lap that does something else",
        "steps:\n  - repeat: {every: 5 min, if a lap overruns: wait, steps: [wait: 1 s]}\n",
        (6, 47, 4),
        '"wait" does not say when a late lap begins.',
        "Known: at once, next interval.",
    ),
    Case(
        "a loop without end where the mission ends",
        "limits: {end by: 06:00}\nsteps:\n  - repeat: {every: 0 s, steps: [wait: 1 s]}\n",
        (7, 21, 3),
        "The time from lap to lap cannot be 0 s.",
        "Write something from 1 s to 24 h.",
    ),
    Case(
        "a when without then",
        "steps:\n  - when: battery < 20 %\n    else: [wait: 1 s]\n",
        (6, 5, 4),
        'The step when needs "then".',
        "Add for example: then: [go: charging bay]",
    ),
    Case(
        "a routine that is not there",
        "routines:\n  knock: {given: [room], steps: [go: room]}\nsteps:\n  - run: knok\n    with: {room: ward east}\n",
        (8, 10, 4),
        'There is no routine called "knok".',
        'The nearest routine is "knock".',
    ),
    Case(
        "a routine where there are none",
        "steps:\n  - run: knock\n",
        (6, 10, 5),
        'There is no routine called "knock".',
        "Write it under routines.",
    ),
    Case(
        "a parameter left out",
        "routines:\n  knock: {given: [room], steps: [go: room]}\nsteps:\n  - run: knock\n",
        (8, 5, 10),
        'The routine "knock" needs "room".',
        "Add with: {room: ...}",
    ),
    Case(
        "a parameter that is not there",
        "routines:\n  knock: {given: [room], steps: [go: room]}\nsteps:\n  - run: knock\n    with: {rom: ward east}\n",
        (9, 12, 3),
        'The routine "knock" has no parameter "rom".',
        'The nearest parameter is "room".',
    ),
    Case(
        "an argument that is no place",
        "routines:\n  knock: {given: [room], steps: [go: room]}\nsteps:\n  - run: knock\n    with: {room: ward eest}\n",
        (9, 18, 9),
        'There is no place called "ward eest".',
        'The nearest place is "ward east".',
    ),
    Case(
        "a routine that runs itself",
        "routines:\n  a: {steps: [run: b]}\n  b: {steps: [run: a]}\nsteps:\n  - run: a\n",
        (7, 20, 1),
        "A routine cannot run itself.",
        "The chain is a -> b -> a. Use a repeat.",
    ),
    Case(
        "a parameter that the routine does not have",
        'routines:\n  knock: {given: [room], steps: [go: room, notify: "At {rom}"]}\nsteps:\n  - wait: 1 s\n',
        (6, 56, 5),
        'The routine has no parameter "rom".',
        'The nearest parameter is "room".',
    ),
    Case(
        "a parameter called like a place",
        "routines:\n  knock: {given: [laboratory], steps: [go: laboratory]}\nsteps:\n  - wait: 1 s\n",
        (6, 3, 5),
        '"laboratory" is a place of the site, and a parameter of this routine.',
        "Give the parameter another name.",
    ),
    Case(
        "a parameter given twice",
        "routines:\n  knock: {given: [room, room], steps: [go: room]}\nsteps:\n  - wait: 1 s\n",
        (6, 25, 4),
        '"room" is given twice.',
        "Give each parameter a name of its own.",
    ),
    Case(
        "a routine without steps",
        "routines:\n  knock: {given: [room]}\nsteps:\n  - wait: 1 s\n",
        (6, 10, 15),
        'A routine needs "steps".',
        "Add for example: steps: [go: ward east]",
    ),
    Case(
        "routines that grow beyond all bounds",
        "routines:\n"
        + "  a: {steps: ["
        + ", ".join(["wait: 1 s"] * 60)
        + "]}\n"
        + "  b: {steps: ["
        + ", ".join(["run: a"] * 60)
        + "]}\n"
        + "  c: {steps: ["
        + ", ".join(["run: b"] * 60)
        + "]}\n"
        + "steps:\n  - run: c\n",
        (8, 452, 1),
        "With its routines written out, this mission has over 200,000 steps.",
        "Use a repeat instead of routines that run routines.",
    ),
    Case(
        "a count with a word of conditions",
        "steps:\n  - count: laps\n",
        (6, 12, 4),
        'A count cannot be called "laps".',
        "Write a word or two, for example trays.",
    ),
    Case(
        "a count with a sign in it",
        "steps:\n  - count: trays & cups\n",
        (6, 12, 12),
        "The name of a count consists of letters.",
        "Write a word or two, for example trays.",
    ),
    Case(
        "a count of nothing",
        "steps:\n  - count: trays\n    by: 0\n",
        (7, 9, 1),
        "What is counted at once cannot be 0.",
        "Write 1 to 1000.",
    ),
    Case(
        "an end that is neither",
        "steps:\n  - end: done\n",
        (6, 10, 4),
        'A mission does not end "done".',
        "Write end: completed or end: failed",
    ),
    Case(
        "a standing order without a name",
        "standing orders:\n  - {when: battery < 20 %, do: [wait: 1 s]}\nsteps:\n  - wait: 1 s\n",
        (6, 5, 39),
        'A standing order needs "name".',
        "Add for example: name: low battery",
    ),
    Case(
        "a standing order that does nothing",
        "standing orders:\n  - {name: low, when: battery < 20 %}\nsteps:\n  - wait: 1 s\n",
        (6, 5, 33),
        'A standing order needs "do".',
        "Add for example: do: [charge: {at: charging bay, until: battery >= 70 %}]",
    ),
    Case(
        "a standing order that goes on otherwise",
        "standing orders:\n"
        "  - {name: low, when: battery < 20 %, do: [wait: 1 s], then: carryon}\n"
        "steps:\n"
        "  - wait: 1 s\n",
        (6, 62, 7),
        '"carryon" does not say what follows a standing order.',
        'The nearest wording is "carry on".',
    ),
    Case(
        "two standing orders of one name",
        "standing orders:\n"
        "  - {name: low, when: battery < 20 %, do: [wait: 1 s]}\n"
        "  - {name: low, when: battery < 10 %, do: [wait: 1 s]}\n"
        "steps:\n"
        "  - wait: 1 s\n",
        (7, 6, 9),
        'There are two standing orders called "low".',
        "Give each a name of its own.",
    ),
    Case(
        "a clock time alone in a standing order",
        "standing orders:\n  - {name: low, when: 05:30, do: [wait: 1 s]}\nsteps:\n  - wait: 1 s\n",
        (6, 23, 5),
        "A clock time alone is not a condition here.",
        "Write clock >= 05:30.",
    ),
    Case(
        "a proof without a confidence",
        "prove: {legs arrive: 95 %}\nsteps:\n  - wait: 1 s\n",
        (5, 8, 19),
        '"prove" needs "confidence".',
        "Add for example: confidence: 90 %",
    ),
    Case(
        "a proof of certainty",
        "prove: {legs arrive: 100 %, confidence: 90 %}\nsteps:\n  - wait: 1 s\n",
        (5, 22, 5),
        "The share of legs that arrive cannot be 100 %.",
        "Write something from 1 % to 99.99 %.",
    ),
    Case(
        "a finding that is no name",
        "silence: [Place never visited]\nsteps:\n  - wait: 1 s\n",
        (5, 11, 19),
        '"Place never visited" is not the name of a finding.',
        "Write it as check prints it, for example place-never-visited.",
    ),
    Case(
        "a shared file that is not there",
        "include: [nowhere/shared.yaml]\nsteps:\n  - wait: 1 s\n",
        (5, 11, 19),
        "There is no file nowhere/shared.yaml.",
        'There is no folder "nowhere" either.',
    ),
    Case(
        "a file that includes itself",
        "include: [round.yaml]\nsteps:\n  - wait: 1 s\n",
        (5, 11, 10),
        "A file cannot include itself.",
        "The chain is round.yaml -> round.yaml.",
    ),
)
