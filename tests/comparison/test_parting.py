"""The first frame in which two runs part, in cases made by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.evaluation.made import make_tracks, random_scene, standing
from tracker.comparison.parting import find_parting
from tracker.evaluation import Scope
from tracker.log import Kind
from tracker.results import Tracks, TrackState

FRAMES = range(1, 7)
TWO = sorted(standing(FRAMES, 1) + standing(FRAMES, 2, left=100.0))


def with_lines(tracks: Tracks) -> Tracks:
    """Each row from a line of its own, the same for the same frame and place."""
    line = tracks.frame * 1000 + (tracks.z[:, 0] // 10).astype(np.int64)
    return replace(tracks, line=line)


def part(a, b, *, lines=True, scope=None):
    a, b = (make_tracks(rows) if isinstance(rows, list) else rows for rows in (a, b))
    if lines:
        a, b = with_lines(a), with_lines(b)
    found = find_parting(a, b, scope or Scope())
    assert found.by == ("line" if lines else "place")
    return found


@pytest.mark.parametrize("lines", [True, False])
def test_equal_runs_never_part(lines):
    found = part(TWO, TWO, lines=lines)
    assert (found.frame, found.differences, found.moved_frame) == (None, (), None)


@pytest.mark.parametrize("lines", [True, False])
def test_other_numbers_for_the_same_tracks_are_no_difference(lines):
    renamed = [(f, {1: 70, 2: 5}[k], *rest) for f, k, *rest in TWO]
    assert part(TWO, sorted(renamed), lines=lines).frame is None


@pytest.mark.parametrize("lines", [True, False])
def test_a_row_that_only_one_reports(lines):
    less = [row for row in TWO if row[:2] != (4, 2)]
    found = part(TWO, less, lines=lines)
    assert (found.frame, found.time) == (4, 0.4)
    assert [(d.kind, d.track_a, d.track_b) for d in found.differences] == [("only-a", 2, None)]
    assert "only A reports" in found.differences[0].words
    assert "as its track 2" in found.differences[0].words
    found = part(less, TWO, lines=lines)
    assert [(d.kind, d.track_a, d.track_b) for d in found.differences] == [("only-b", None, 2)]


@pytest.mark.parametrize("lines", [True, False])
def test_identities_that_change_places(lines):
    swapped = sorted(
        (f, k if f < 4 else 3 - k, *rest) for f, k, *rest in TWO
    )  # 1 and 2 swap in frame 4
    renamed = [(f, k + 10, *rest) for f, k, *rest in swapped]
    found = part(TWO, sorted(renamed), lines=lines)
    assert found.frame == 4
    assert [(d.kind, d.track_a, d.track_b) for d in found.differences] == [
        ("identity", 1, 12), ("identity", 2, 11),
    ]  # fmt: skip
    first = found.differences[0]
    assert (first.known_a, first.known_b) == (2, 11)
    assert "A's track 1 (until then B's 11)" in first.words
    assert "B's track 12 (until then A's 2)" in first.words


def test_a_new_identity_in_one_run():
    broken = sorted((f, 9 if k == 2 and f >= 5 else k, *rest) for f, k, *rest in TWO)
    found = part(TWO, broken)
    assert found.frame == 5
    (only,) = found.differences
    assert (only.kind, only.track_a, only.track_b) == ("identity", 2, 9)
    assert only.line is not None
    # 9 is new in B: nothing was known of it.
    assert only.words.endswith("is A's track 2 (until then B's 2) and B's track 9")
    (other,) = part(broken, TWO).differences
    assert other.words.endswith("is A's track 9 and B's track 2 (until then A's 2)")


def test_two_tracks_of_one_run_for_one_of_the_other():
    merged = [(f, 1, *rest) for f, k, *rest in TWO if (k == 1) == (f < 4)]
    split = [(f, k, *rest) for f, k, *rest in TWO if (k == 1) == (f < 4)]
    for a, b in ((merged, split), (split, merged)):
        found = part(a, b)
        assert (found.frame, found.differences[0].kind) == (4, "identity")


def test_lines_tell_rows_that_lie_on_each_other():
    """Two boxes that overlap: by lines the identities are swapped, however close they are."""
    close = sorted(standing(FRAMES, 1) + standing(FRAMES, 2, left=1.0))
    line = np.array([f * 10 + k for f, k, *_ in close])
    a = make_tracks(close, line=line)
    b = make_tracks([(f, 3 - k if f > 2 else k, *rest) for f, k, *rest in close], line=line)
    found = find_parting(a, b, Scope())
    assert (found.frame, found.by) == (3, "line")


def test_by_place_the_closest_row_counts_not_the_last_one():
    """Two boxes that overlap: a swap shows at once, though each could stay with the other."""
    close = sorted(standing(FRAMES, 1) + standing(FRAMES, 2, left=2.0))
    swapped = sorted((f, 3 - k if f > 2 else k, *rest) for f, k, *rest in close)
    found = part(close, swapped, lines=False)
    assert (found.frame, len(found.differences)) == (3, 2)


def test_lines_of_another_log_are_not_trusted():
    a = with_lines(make_tracks(TWO))
    # Lines are one frame late; nothing moves, so each common line lies on itself.
    late = replace(a, line=a.line + 1000)
    found = find_parting(a, late, Scope())
    assert (found.by, found.frame) == ("place", None)


def test_lines_that_lie_elsewhere_are_not_trusted():
    a = with_lines(make_tracks(TWO))
    other_frame = replace(a, line=np.arange(len(a)))
    other_place = replace(a, line=a.line[np.argsort(a.frame * 10 + 3 - a.track)])
    for b in (other_frame, other_place, replace(a, line=np.full(len(a), -1))):
        found = find_parting(a, b, Scope())
        assert (found.by, found.frame) == ("place", None)


def test_places_that_differ():
    moved = [(f, k, left + (0.5 if f >= 3 else 0.0), *rest) for f, k, left, *rest in TWO]
    a = with_lines(make_tracks(TWO))
    found = find_parting(a, replace(make_tracks(moved), line=a.line), Scope())
    assert (found.frame, found.moved_frame, found.moved_by) == (None, 3, 0.5)


def test_coasting_rows_have_no_line_and_are_told_by_place():
    a = with_lines(make_tracks(TWO))
    unseen = (a.frame == 3) & (a.track == 2)
    state = np.where(unseen, TrackState.COASTING, TrackState.CONFIRMED).astype(np.int8)
    a = replace(a, line=np.where(unseen, -1, a.line), state=state)
    assert find_parting(a, a, Scope()).frame is None
    left_out = replace(a, reported=~unseen)
    assert find_parting(a, left_out, Scope()).frame == 3
    assert find_parting(a, left_out, Scope(count_coasting=False)).frame is None


def test_points():
    rows = [(f, 1, 5.0 * f, 0.0) for f in FRAMES]
    a = make_tracks(rows, Kind.POINT)
    scope = Scope(distance_threshold=2.0)
    near = make_tracks([(f, 1, x + 1.5, y) for f, _, x, y in rows], Kind.POINT)
    far = make_tracks([(f, 1, x + 2.5, y) for f, _, x, y in rows], Kind.POINT)
    found = find_parting(a, near, scope)
    assert (found.frame, found.moved_frame, found.moved_by) == (None, 1, 1.5)
    found = find_parting(a, far, scope)
    assert found.frame == 1
    assert [d.kind for d in found.differences] == ["only-a", "only-b"]


def test_a_run_without_tracks():
    found = find_parting(make_tracks([]), make_tracks(TWO), Scope())
    assert (found.frame, len(found.differences)) == (1, 2)
    assert find_parting(make_tracks([]), make_tracks([]), Scope()).frame is None


@pytest.mark.parametrize("seed", range(5))
def test_from_both_sides_the_same_frame(seed):
    a, _ = random_scene(seed)
    rng = np.random.default_rng(seed)
    changed = a.track.copy()
    k = int(rng.integers(len(a)))
    changed[(a.frame >= a.frame[k]) & (a.track == a.track[k])] = 99_999
    earlier = bool(np.any(changed == a.track[k]))
    wanted = int(a.frame[changed != a.track].min()) if earlier else None
    b = replace(a, track=changed)
    assert find_parting(a, b, Scope()).frame == find_parting(b, a, Scope()).frame == wanted
