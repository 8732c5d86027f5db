"""On which line of a brief each key stands, and where a quote was never closed."""

from __future__ import annotations

import tomllib

import pytest
from brief_samples import FIELD, GOOD, LEAST, changed

from optopick.toml_lines import key_lines, unclosed_quote


class TestLines:
    def test_every_line(self):
        text = changed(GOOD, ('table = "parts.csv"', 'table = """\n[not.a.section]\nx = 1\n"""'))
        lines = text.split("\n")
        found = key_lines(text)
        for path, line in found.items():
            assert path[-1] in lines[line - 1] or path[0] in lines[line - 1], path
        assert found["drive", "max_current"] == lines.index('max_current = "8 mA"') + 1
        assert found["limits", "isolation", "creepage"] == found["limits", "isolation"]
        assert found["stock", "r_be", "absent"] == found["stock", "r_be"]
        assert ("not", "a", "section") not in found

    def test_keys_are_those_of_the_parser(self):
        def paths(table, prefix=()):
            for name, value in table.items():
                yield (*prefix, name)
                if isinstance(value, dict):
                    yield from paths(value, (*prefix, name))

        for text in (GOOD, LEAST, FIELD):
            assert set(key_lines(text)) == set(paths(tomllib.loads(text)))

    @pytest.mark.parametrize(
        ("text", "path", "line"),
        [
            ("a = 1\nb = 2", ("b",), 2),
            ("# a = 1\n\n  a = 1", ("a",), 3),
            ('"a b" = 1', ("a b",), 1),
            ("'a.b' = 1", ("a.b",), 1),
            ("[a.b]\nc = 1", ("a", "b", "c"), 2),
            ("[a]\nb.c = 1", ("a", "b", "c"), 2),
            ("[a]\nb.c = 1", ("a", "b"), 2),
            ("[[a]]\nb = 1", ("a", "b"), 2),
            ("a = [\n 1, # b = 2\n 2,\n]\nb = 3", ("b",), 5),
            ("a = [{ b = 1 },\n{ b = 2 }]\nc = 3", ("c",), 3),
            ("a = { b = [1,\n2], c = { d = 1 } }", ("a", "c", "d"), 2),
            ("a = {}\nb = 1", ("b",), 2),
            ("a = { b.c = [\n1], d = 2 }", ("a", "d"), 2),
            ("a = { b = {}, c = 2 }\nd = 1", ("a", "c"), 1),
            ('\n"\\U000000b5\\t" = 1', ("µ\t",), 2),
            ("a = '''\nb = 1\n'''\nc = 1", ("c",), 4),
            ('a = "x\\"#="\nb = 1', ("b",), 2),
            ('a = """x"""""\nb = 1', ("b",), 2),
            ("a = 1.5\nb = 1979-05-27\nc = 1", ("c",), 3),
        ],
    )
    def test_places(self, text, path, line):
        tomllib.loads(text)  # the sample itself is valid
        assert key_lines(text)[path] == line

    @pytest.mark.parametrize("text", ["a = 'b", "}}} = 1", '"\\x" = 1', "]\n[", "= = =", "[a\nb = {", "a = ]]"])
    def test_text_that_is_no_toml_does_no_harm(self, text):
        assert all(1 <= line <= text.count("\n") + 1 for line in key_lines(text).values())

    @pytest.mark.parametrize(
        ("text", "line"),
        [
            ("", None),
            ("a = 'b'\n# it's\n", None),
            ("a = 'b", 1),
            ('\na = 1\nb = "c\nd = 1', 3),
            ('\n\na = """\n"b"\n', 3),
            ("a = 'b'\nc = 'd\n", 2),
        ],
    )
    def test_quote_that_is_never_closed(self, text, line):
        assert unclosed_quote(text) == line

    def test_keys_inside_lists_have_no_line(self):
        assert set(key_lines("a = [{ b = 1 }, [{ c = 2 }]]")) == {("a",)}
