"""Conditions in `until`, `when` and standing orders: text to expressions, and back again for any of them."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from runner.language.expression_reader import OUTCOMES, RESERVED, parse_condition, parse_until
from runner.language.expressions import Expression, Kind, Operator, Quantity
from runner.language.quantities import PhraseError

HALF_PAST_FIVE = Expression(Kind.COMPARE, quantity=Quantity.CLOCK, operator=Operator.AT_LEAST, value=19_800.0)
SYMBOLS = [operator.value for operator in Operator]


def compare(quantity: Quantity, operator: str, value: float, word: str = "") -> Expression:
    return Expression(Kind.COMPARE, quantity=quantity, operator=Operator(operator), value=value, word=word)


@pytest.mark.parametrize(
    ("text", "expression"),
    [
        ("battery < 20 %", compare(Quantity.BATTERY, "<", 0.2)),
        ("battery>=70%", compare(Quantity.BATTERY, ">=", 0.7)),
        ("clock >= 05:30", HALF_PAST_FIVE),
        ("elapsed > 2 h", compare(Quantity.ELAPSED, ">", 7_200.0)),
        ("laps >= 3", compare(Quantity.LAPS, ">=", 3.0)),
        ("trays taken = 5", compare(Quantity.COUNT, "=", 5.0, "trays taken")),
        ("last leg skipped", Expression(Kind.LAST_LEG, word="skipped")),
        ("answer is come back later", Expression(Kind.ANSWER, word="come back later")),
        ('answer is "now or never"', Expression(Kind.ANSWER, word="now or never")),
        ("proven", Expression(Kind.PROVEN)),
    ],
)
def test_each_single_condition_is_read(text: str, expression: Expression) -> None:
    assert parse_condition(text).condition.expression == expression


def test_not_binds_closest_then_and_then_or() -> None:
    found = parse_condition("not proven and last leg failed or proven").condition.expression
    failed, proven = Expression(Kind.LAST_LEG, word="failed"), Expression(Kind.PROVEN)
    negated = Expression(Kind.NOT, (proven,))
    assert found == Expression(Kind.OR, (Expression(Kind.AND, (negated, failed)), proven))


def test_a_condition_keeps_how_long_it_must_last_and_what_was_written() -> None:
    condition = parse_condition("battery < 20 % for 10 s").condition
    assert (condition.lasting, condition.text) == (10.0, "battery < 20 % for 10 s")


def test_until_takes_a_clock_time_alone() -> None:
    condition = parse_until("05:30").condition
    assert (condition.expression, condition.text) == (HALF_PAST_FIVE, "05:30")


NAMES = st.from_regex(r"[a-z]{2,6}( [a-z]{2,6})?", fullmatch=True).filter(
    lambda name: not set(name.split()) & set(RESERVED)
)
SINGLE = st.one_of(
    st.builds(compare, st.just(Quantity.BATTERY), st.sampled_from("<>"), st.integers(0, 100).map(lambda n: n / 100)),
    st.builds(compare, st.just(Quantity.ELAPSED), st.sampled_from(["<=", ">="]), st.integers(1, 600_000).map(float)),
    st.builds(
        compare, st.just(Quantity.CLOCK), st.sampled_from(["<", ">="]), st.integers(0, 1439).map(lambda n: n * 60.0)
    ),
    st.builds(compare, st.just(Quantity.LAPS), st.sampled_from(SYMBOLS), st.integers(0, 1000)),
    st.builds(compare, st.just(Quantity.COUNT), st.sampled_from(SYMBOLS), st.integers(0, 1000), NAMES),
    st.sampled_from(OUTCOMES).map(lambda word: Expression(Kind.LAST_LEG, word=word)),
    NAMES.map(lambda word: Expression(Kind.ANSWER, word=word)),
    st.just(Expression(Kind.PROVEN)),
)


def joined(parts: st.SearchStrategy[Expression]) -> st.SearchStrategy[Expression]:
    several = st.lists(parts, min_size=2, max_size=3).map(tuple)
    return st.one_of(
        st.builds(Expression, st.sampled_from([Kind.AND, Kind.OR]), several),
        parts.map(lambda part: Expression(Kind.NOT, (part,))),
    )


def written(expression: Expression) -> str:
    """The expression with all its parentheses."""
    if expression.kind is Kind.COMPARE:
        return written_comparison(expression)
    if expression.kind is Kind.NOT:
        return f"not {in_parentheses(expression.parts[0])}"
    if expression.parts:
        return f" {expression.kind.value} ".join(map(in_parentheses, expression.parts))
    lead = {Kind.LAST_LEG: "last leg ", Kind.ANSWER: "answer is "}.get(expression.kind, expression.kind.value)
    return lead + expression.word


def in_parentheses(expression: Expression) -> str:
    return f"({written(expression)})" if expression.parts else written(expression)


def written_comparison(expression: Expression) -> str:
    assert expression.quantity is not None
    assert expression.operator is not None
    value = expression.value
    text = {
        Quantity.BATTERY: f"{value * 100:.0f} %",
        Quantity.ELAPSED: f"{value:.0f} s",
        Quantity.CLOCK: f"{int(value) // 3600:02d}:{int(value) // 60 % 60:02d}",
    }.get(expression.quantity, f"{value:.0f}")
    return f"{expression.word or expression.quantity.value} {expression.operator.value} {text}"


@given(st.recursive(SINGLE, joined, max_leaves=8))
def test_a_condition_that_is_written_out_reads_as_the_same_one(expression: Expression) -> None:
    assert parse_condition(written(expression)).condition.expression == expression


@given(st.text(alphabet="abty<>=() '\"0123 %:forandnot", max_size=60))
def test_any_text_is_a_condition_or_a_fault_that_lies_in_it(text: str) -> None:
    found = fault(text)
    if found is not None:
        assert 0 <= found.start <= found.end <= len(text)
        assert found.sentence
        assert found.help


def fault(text: str) -> PhraseError | None:
    try:
        parse_condition(text)
    except PhraseError as error:
        return error
    return None
