"""Every mistake gets one diagnostic: the right line and column, a sentence, and what to write instead."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from runner.language.diagnostics import LanguageError
from tests.language import texts
from tests.language.golden import Case
from tests.language.golden_asked import IN_WHAT_IS_ASKED
from tests.language.golden_constructs import IN_CONSTRUCTS
from tests.language.golden_missions import IN_RULES_AND_LIMITS, IN_STEPS
from tests.language.golden_sites import IN_CONDITIONS, IN_SITES
from tests.language.golden_yaml import IN_YAML

IN_MISSIONS = IN_STEPS + IN_RULES_AND_LIMITS + IN_YAML + IN_WHAT_IS_ASKED + IN_CONSTRUCTS


def names(cases: tuple[Case, ...]) -> list[str]:
    return [case.mistake for case in cases]


@pytest.mark.parametrize("case", IN_MISSIONS, ids=names(IN_MISSIONS))
def test_a_mistake_in_a_mission_is_told_where_it_is(case: Case) -> None:
    check(texts.mission, case)


@pytest.mark.parametrize("case", IN_SITES, ids=names(IN_SITES))
def test_a_mistake_in_a_site_is_told_where_it_is(case: Case) -> None:
    check(texts.site, case)


@pytest.mark.parametrize("case", IN_CONDITIONS, ids=names(IN_CONDITIONS))
def test_a_mistake_in_conditions_is_told_where_it_is(case: Case) -> None:
    check(texts.conditions, case)


def check(read: Callable[[str], object], case: Case) -> None:
    with pytest.raises(LanguageError) as caught:
        read(case.text)
    found = texts.only(caught.value)
    mark = found.mark
    assert ((mark.line, mark.column, mark.width), found.sentence, found.help) == (
        case.place,
        case.sentence,
        case.help,
    )


def test_all_problems_of_a_file_are_told_at_once_and_in_their_order() -> None:
    body = """\
limits: {speed: 0.8}
steps:
  - go: ward eest
    within: 4
  - repeat:
      steps:
        - wait: 2
"""
    with pytest.raises(LanguageError) as caught:
        texts.mission(body)
    places = [(found.mark.line, found.mark.column) for found in caught.value.diagnostics]
    assert places == [(5, 17), (7, 9), (8, 13), (9, 5), (11, 17)]


def test_a_misspelled_key_is_not_told_a_second_time_as_missing() -> None:
    with pytest.raises(LanguageError) as caught:
        texts.mission(texts.STEPS, head=texts.HEAD.replace("start:", "strat:"))
    assert texts.only(caught.value).sentence == 'A mission has no key "strat".'


def test_reading_stops_after_a_hundred_problems() -> None:
    with pytest.raises(LanguageError) as caught:
        texts.mission("steps:\n" + "  - go: nowhere\n" * 500)
    assert len(caught.value.diagnostics) == 100
