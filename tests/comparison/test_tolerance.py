"""`--no-worse-than`: what it takes, and who passes."""

from __future__ import annotations

import pytest

from tracker.comparison import Change, judge, parse_tolerance
from tracker.errors import UsageError


@pytest.mark.parametrize(
    ("text", "score", "amount"),
    [
        ("idf1=0.005", "idf1", 0.005),
        (" idf1 = 0.5% ", "idf1", 0.005),
        ("switches=3", "switches", 3.0),
        ("motp=2.5", "motp", 2.5),
        ("mota=0", "mota", 0.0),
    ],
)
def test_what_is_taken(text, score, amount):
    found = parse_tolerance(text)
    assert (found.score, found.amount) == (score, pytest.approx(amount))


@pytest.mark.parametrize(
    ("text", "sentence"),
    [
        ("idf1", "reads like 'idf1=0.005'"),
        ("idf1>=0.5", "reads like"),
        ("idf1=much", "reads like"),
        ("idf1=1.2.3", "reads like"),
        ("idf=0.1", "did you mean 'idf1'"),
        ("frames=3", "no score that can be better or worse"),
        ("switches=3%", "switches is no ratio"),
        ("idf1=-0.1", "at least 0"),
        ("idf1=5", "write 0.005 or 0.5%"),
        ("switches=inf", "reads like"),
    ],
)
def test_what_is_refused(text, sentence):
    with pytest.raises(UsageError, match=sentence):
        parse_tolerance(text)


def verdict(text, change, *, by_interval=False):
    (found,) = judge({change.score: change}, [parse_tolerance(text)], by_interval=by_interval)
    return found


LOSS = Change("idf1", 0.700, 0.695, 0.695 - 0.700, -0.02, 0.01, 0.3)
FEWER = Change("switches", 30, 27, -3, -8, 2, 0.8)


@pytest.mark.parametrize(
    ("text", "change", "by_interval", "met", "worse_by"),
    [
        ("idf1=0.005", LOSS, False, True, 0.005),  # exactly at the tolerance, but for rounding
        ("idf1=0.0049", LOSS, False, False, 0.005),
        ("idf1=0.005", LOSS, True, False, 0.02),
        ("idf1=0.02", LOSS, True, True, 0.02),
        ("switches=0", FEWER, False, True, -3),
        ("switches=0", FEWER, True, False, 2),
        ("switches=2", FEWER, True, True, 2),
    ],
)
def test_who_passes(text, change, by_interval, met, worse_by):
    found = verdict(text, change, by_interval=by_interval)
    assert found.met is met
    assert found.worse_by == pytest.approx(worse_by)


@pytest.mark.parametrize("by_interval", [False, True])
def test_without_a_value_nothing_passes(by_interval):
    found = verdict("motp=9", Change("motp", None, 0.2, None), by_interval=by_interval)
    assert (found.met, found.found) == (False, "no value")


def test_without_an_interval_none_passes_by_it():
    assert not verdict("idf1=0.5", Change("idf1", 0.5, 0.6, 0.1), by_interval=True).met


def test_words():
    assert verdict("idf1=0.001", LOSS).found == "worse by 0.005"
    assert verdict("switches=0", FEWER).found == "better by 3"
    assert verdict("mota=0", Change("mota", 0.5, 0.5, 0.0)).found == "the same"
    assert verdict("idf1=0.001", LOSS, by_interval=True).name.endswith("by the interval")
    assert "at most 0.001 worse is allowed" in verdict("idf1=0.001", LOSS).message
