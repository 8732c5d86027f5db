"""Briefs spoilt at random: what comes out is a sound brief or an InputError, nothing else."""

from __future__ import annotations

import datetime
import math
import tomllib
from pathlib import Path

import pytest
from brief_samples import SAMPLES, assert_sound
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from optopick.errors import InputError
from optopick.read_brief import brief_from_mapping, brief_from_text


@pytest.fixture(autouse=True)
def _in_a_folder_with_parts(tmp_path, monkeypatch):
    (tmp_path / "parts.csv").touch()
    (tmp_path / "shelf.csv").write_text("value\n1k\n4k7\n", encoding="utf-8")
    monkeypatch.chdir(tmp_path)


# What a hurried hand or a broken script does to a line of a brief.
_ODD_VALUES = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(),
    st.floats(),
    st.text(max_size=12),
    st.sampled_from(
        ["E24", "parts.csv", "shelf.csv", ".", "-3 V", "1e999 V", "4k7", "%", "field", "sink", math.nan, 10**400, -0.0]
    ),
    st.sampled_from([datetime.date(2026, 1, 1), datetime.time(1, 2), b"x", 1j, object]),
)
_ODD_TREES = st.recursive(
    _ODD_VALUES,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=6), inner, max_size=3),
    max_leaves=5,
)
_EDITS = [*"\"'[]{}=.,#\n\\", "\r\n", '"""', " V", "0"]
_SETTINGS = settings(
    max_examples=300, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture, HealthCheck.too_slow]
)
_SAMPLES = st.sampled_from(list(SAMPLES.values()))


def assert_brief_or_input_error(read) -> None:
    try:
        brief = read()
    except InputError as error:
        assert error.mistakes
        assert all(mistake.where and mistake.found and mistake.expected for mistake in error.mistakes)
    else:
        assert_sound(brief)


@_SETTINGS
@given(sample=_SAMPLES, data=st.data())
def test_text_with_random_edits(sample, data):
    for _ in range(data.draw(st.integers(1, 3))):
        start = data.draw(st.integers(0, len(sample)))
        end = start + data.draw(st.integers(0, 6))
        edit = data.draw(st.text(max_size=4) | st.sampled_from(_EDITS))
        sample = sample[:start] + edit + sample[end:]
    assert_brief_or_input_error(lambda: brief_from_text(sample, Path("link.toml")))


@_SETTINGS
@given(sample=_SAMPLES, data=st.data())
def test_lines_dropped_doubled_and_swapped(sample, data):
    lines = sample.splitlines()
    for _ in range(data.draw(st.integers(1, 4))):
        index, other = (data.draw(st.integers(0, len(lines) - 1)) for _ in range(2))
        what = data.draw(st.sampled_from(["drop", "double", "swap"]))
        if what == "swap":
            lines[index], lines[other] = lines[other], lines[index]
        elif what == "double":
            lines.insert(other, lines[index])
        elif len(lines) > 1:
            del lines[index]
    assert_brief_or_input_error(lambda: brief_from_text("\n".join(lines), Path("link.toml")))


@_SETTINGS
@given(sample=_SAMPLES, data=st.data())
def test_mapping_with_odd_values(sample, data):
    document = tomllib.loads(sample)
    for _ in range(data.draw(st.integers(1, 3))):
        table = document
        while True:
            name = data.draw(st.sampled_from(sorted(table)) if table else st.text(max_size=4))
            inner = table.get(name)
            if not isinstance(inner, dict) or not inner or data.draw(st.booleans()):
                break
            table = inner
        table[name] = data.draw(_ODD_TREES)
    assert_brief_or_input_error(lambda: brief_from_mapping(document, Path()))


@pytest.mark.parametrize("sample", SAMPLES.values(), ids=SAMPLES)
def test_samples_themselves_are_right(sample):
    assert_sound(brief_from_text(sample, Path("link.toml")))
