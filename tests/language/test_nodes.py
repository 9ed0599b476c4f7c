"""Text to marked nodes: nothing is guessed, everything has its place, and what is not read is refused."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from runner.language.diagnostics import LanguageError, source_lines
from runner.language.nodes import Mapping, Node, Scalar, parse
from runner.language.pages import Reading
from runner.language.reader import load_mission, load_site, read_site
from tests.language import texts

WORDS = st.text(alphabet="abc xyz0123:#-_.\u00e9\u65e5\U0001f600", min_size=1, max_size=12).map(str.strip).filter(bool)


def tree(text: str) -> Node:
    root = parse(text, lambda *problem: pytest.fail(str(problem)))
    assert root is not None
    return root


def first_problem(data: bytes, tmp_path) -> tuple[int, int, str]:
    path = tmp_path / "round.yaml"
    path.write_bytes(data)
    with pytest.raises(LanguageError) as caught:
        load_mission(path)
    found = caught.value.diagnostics[0]
    return found.mark.line, found.mark.column, found.sentence


@pytest.mark.parametrize(
    "word", ["on", "no", "yes", "off", "~", "null", "012", "1:30", "1_000", "2024-01-01", "1e3", "0x1F"]
)
def test_words_that_yaml_would_guess_at_stay_as_they_are_written(word: str) -> None:
    root = tree(f"key: {word}")
    assert isinstance(root, Mapping)
    value = root.pairs["key"][1]
    assert isinstance(value, Scalar)
    assert value.text == word


def test_places_may_be_called_by_words_that_yaml_would_guess_at() -> None:
    site = read_site(texts.SITE + "  no: {at: [1, 1], facing: east}\n  1:30: {at: [2, 1], facing: east}\n", "f.yaml")
    assert [place.name for place in site.places][-2:] == ["no", "1:30"]


@given(st.dictionaries(WORDS, WORDS, min_size=1, max_size=6), st.sampled_from(["\n", "\r\n", "\r"]))
def test_a_mark_points_at_the_text_it_claims(pairs: dict[str, str], newline: str) -> None:
    quoted = [(f"'{key}'", f'"{value}"') for key, value in pairs.items()]
    text = newline.join(f"{key}:   {value}" for key, value in quoted) + newline
    page = Reading().open_text(text, "f.yaml")
    assert page is not None
    assert page.root is not None
    lines = source_lines(text)
    for (key_text, value_text), (key, value) in zip(quoted, page.root.pairs.values(), strict=True):
        for node, claimed in ((key, key_text), (value, value_text)):
            mark = page.mark(node)
            assert lines[mark.line - 1][mark.column - 1 : mark.column - 1 + mark.width] == claimed


def test_marks_ignore_a_byte_order_mark(tmp_path) -> None:
    path = tmp_path / "floor.yaml"
    path.write_bytes(b"\xef\xbb\xbfsight: x\n")
    with pytest.raises(LanguageError) as caught:
        load_site(path)
    assert (caught.value.diagnostics[0].mark.line, caught.value.diagnostics[0].mark.column) == (1, 1)
    assert str(caught.value).split("\n")[1] == "  sight: x"


def test_aliases_that_would_explode_are_refused_at_their_first_line() -> None:
    bomb = "a: &a [x, x]\n" + "".join(
        f"{new}: &{new} [*{old}, *{old}]\n" for old, new in zip("abcdefgh", "bcdefghi", strict=True)
    )
    with pytest.raises(LanguageError) as caught:
        texts.mission(bomb)
    assert caught.value.diagnostics[0].sentence == "Anchors are not read."
    assert caught.value.diagnostics[1].sentence == "Anchors are not read."
    assert caught.value.diagnostics[2].sentence == "Aliases are not read."


def test_a_list_that_holds_itself_is_refused() -> None:
    with pytest.raises(LanguageError) as caught:
        texts.mission("steps: &all [*all]\n")
    assert [found.sentence for found in caught.value.diagnostics] == ["Anchors are not read.", "Aliases are not read."]


@pytest.mark.parametrize("opening", ["[", "{a: ", "- ", "? ", "- ? "])
def test_nesting_without_end_is_a_diagnostic(opening: str) -> None:
    with pytest.raises(LanguageError) as caught:
        texts.mission(opening * 100_000, head="")
    assert (
        "nested" in caught.value.diagnostics[-1].sentence or "cannot be a key" in caught.value.diagnostics[0].sentence
    )


def test_a_file_over_one_megabyte_is_refused(tmp_path) -> None:
    assert first_problem(b"#" * 1_000_001, tmp_path) == (1, 1, "This file is larger than 1 MB.")


def test_bytes_that_are_no_utf8_are_refused_where_they_stand(tmp_path) -> None:
    assert first_problem(b"mission: Round\nsite: caf\xe9\n", tmp_path) == (
        2,
        10,
        "This file is not UTF-8 text from here on.",
    )


def test_an_invisible_character_is_refused_where_it_stands(tmp_path) -> None:
    found = first_problem(b"mission: Round\r\nsite: a\x00b\n", tmp_path)
    assert found == (2, 8, "There is an invisible control character here, U+0000.")


@pytest.mark.parametrize("data", [b"", b"\n\n", b"# nothing\n", b"---\n", b"\xef\xbb\xbf"])
def test_an_empty_file_is_told_to_be_empty(data: bytes, tmp_path) -> None:
    assert first_problem(data, tmp_path) == (1, 1, "This file is empty.")


@pytest.mark.parametrize("text", ["just words", "- a\n- b", "[a, b]"])
def test_a_file_without_keys_is_told_to_have_none(text: str) -> None:
    with pytest.raises(LanguageError) as caught:
        texts.mission(text, head="")
    assert texts.only(caught.value).sentence == "This file does not consist of keys and values."
