"""Watching a run: lines for logs, a bar for terminals, silence."""

from __future__ import annotations

import io
import itertools

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gridcarb.cli.progress import TOLD, Bar, Lines, Silence, duration_words, rate_words, watcher


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


class Clock:
    """A clock that moves on by one second whenever it is read."""

    def __init__(self) -> None:
        self.now = 0.0

    def __call__(self) -> float:
        self.now += 1.0
        return self.now


def watch(lines: Lines, blocks: int) -> None:
    lines.start(blocks, 1000 * blocks)
    for _ in range(blocks):
        lines.block_done(1000)
    lines.stop()


@settings(deadline=None)
@given(st.integers(min_value=1, max_value=400))
def test_at_most_one_line_per_five_per_cent_and_always_the_last(blocks):
    stream = io.StringIO()
    watch(Lines(stream, Clock()), blocks)
    told = [int(line.split()[0]) for line in stream.getvalue().splitlines()[1:]]
    assert told[-1] == 100
    assert len(told) == min(blocks, 20)
    assert all(later // 5 > earlier // 5 for earlier, later in itertools.pairwise(told))


def test_what_a_line_says():
    stream = io.StringIO()
    watch(Lines(stream, Clock()), 2)
    assert stream.getvalue().splitlines() == [
        "2 blocks, 2,000 cells", " 50 %  1 of 2 blocks  1 thousand cells/s  about 1 s left",
        "100 %  2 of 2 blocks  1 thousand cells/s  in 2 s",
    ]


def test_notes_and_messages_are_written_at_once():
    stream = io.StringIO()
    lines = Lines(stream, Clock())
    lines.message("reading headers")
    lines.start(100, 100)
    lines.block_done(1, "block 7 was tried twice")
    assert stream.getvalue().splitlines() == ["reading headers", "100 blocks, 100 cells", "block 7 was tried twice"]


def test_a_bar_on_a_terminal():
    stream = Terminal()
    bar = Bar(stream, Clock())
    bar.message("reading [headers]")
    bar.start(2, 2000)
    bar.block_done(1000)
    bar.block_done(1000, "block 2 was tried twice")
    bar.stop()
    bar.stop()
    shown = stream.getvalue()
    assert "reading [headers]" in shown
    assert "block 2 was tried twice" in shown
    assert "2/2" in shown
    assert "cells/s" in shown


def test_a_bar_can_be_stopped_before_it_began():
    Bar(Terminal()).stop()


@pytest.mark.parametrize(("quiet", "stream", "kind"), [
    (True, Terminal(), Silence), (False, Terminal(), Bar), (False, io.StringIO(), Lines),
])
def test_the_watcher_suits_the_stream(quiet, stream, kind):
    assert type(watcher(quiet=quiet, stream=stream)) is kind


@pytest.mark.parametrize(("cells", "seconds", "words"), [
    (0, 1, ""), (5, 0, ""), (50, 1, "50 cells/s"), (12_345, 1, "12.3 thousand cells/s"),
    (8_000_000, 2, "4 million cells/s"),
])
def test_rates(cells, seconds, words):
    assert rate_words(cells, seconds) == words


@pytest.mark.parametrize(("seconds", "words"), [(0.2, "0 s"), (59.4, "59 s"), (61, "1 min 1 s"), (7260, "2 h 1 min")])
def test_durations(seconds, words):
    assert duration_words(seconds) == words


@pytest.mark.parametrize("kind", [Lines, Bar])
def test_memory_and_failures_are_shown(kind):
    stream = Terminal()
    looking = kind(stream, Clock())
    looking.start(4, 4000)
    looking.strength(2, 1_250_000_000)
    looking.block_failed("block 2 of 4 failed: no room")
    for _ in range(3):
        looking.block_done(1000)
    looking.stop()
    assert "block 2 of 4 failed: no room" in stream.getvalue()
    assert "1.25 GB  1 failed" in stream.getvalue()


def test_many_failures_are_only_counted():
    stream = io.StringIO()
    lines = Lines(stream, Clock())
    lines.start(1000, 1000)
    for number in range(500):
        lines.block_failed(f"block {number} failed")
    assert len(stream.getvalue().splitlines()) == 1 + TOLD
    assert "only counted" in stream.getvalue().splitlines()[-1]
    lines.block_done(1)
    assert lines._health.words() == "500 failed"
