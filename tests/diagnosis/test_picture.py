"""The picture: complete, the same each time, and legible."""

from __future__ import annotations

import numpy as np
import pytest

from tracker.diagnosis import explain
from tracker.diagnosis.picture import draw
from tracker.diagnosis.picture_labels import Label, place_labels
from tracker.diagnosis.sketch import Sketch, drawn_decisions
from tracker.errors import OutputError, UsageError

PNG = b"\x89PNG\r\n\x1a\n"  # signature of the format, ISO/IEC 15948


def test_a_picture_is_written_the_same_each_time(crossing_run, tmp_path):
    told = explain(crossing_run, 10, track=1, others=[1])
    paths = [tmp_path / "one.png", tmp_path / "other.png"]
    for path in paths:
        draw(told, path)
    assert paths[0].read_bytes() == paths[1].read_bytes()
    assert paths[0].read_bytes().startswith(PNG)
    assert [path.name for path in sorted(tmp_path.iterdir())] == ["one.png", "other.png"]


@pytest.mark.parametrize(
    ("frame", "asked"),
    [
        (10, {}), (14, {"track": 2, "others": [0]}), (16, {"track": 3}), (16, {"detection": 2}),
        (10, {"detection": 0, "others": [2, 3]}), (1, {"detection": 0}), (20, {"track": 3}),
    ],
)  # fmt: skip
def test_points(crossing_run, tmp_path, frame, asked):
    draw(explain(crossing_run, frame, **asked), tmp_path / "a.png")
    assert (tmp_path / "a.png").stat().st_size > 10_000


@pytest.mark.parametrize("frame", [5, 20, 40, 60])
def test_boxes(campus_runs, tmp_path, frame):
    told = explain(campus_runs["contested"], frame)
    draw(told, tmp_path / "a.png")
    for view in told.tracks:
        draw(explain(campus_runs["contested"], frame, track=view.track), tmp_path / "b.png")


def test_an_old_picture_stays_if_the_new_one_fails(crossing_run, tmp_path, monkeypatch):
    from matplotlib.figure import Figure

    path = tmp_path / "a.png"
    path.write_bytes(b"old")

    def full(self, file, **names):
        file.write(b"half")
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Figure, "savefig", full)
    with pytest.raises(OutputError, match=r"a\.png: cannot be written: No space left"):
        draw(explain(crossing_run, 10, track=1), path)
    assert path.read_bytes() == b"old"
    assert len(list(tmp_path.iterdir())) == 1


def test_wrong_names_and_nothing_to_draw(crossing_run, tmp_path):
    with pytest.raises(UsageError, match=r"name it a\.png"):
        draw(explain(crossing_run, 10), tmp_path / "a.jpg")
    with pytest.raises(UsageError, match="nothing to draw"):
        draw(explain(crossing_run, 1), tmp_path / "a.png")
    with pytest.raises(OutputError, match="cannot be written"):
        draw(explain(crossing_run, 10), tmp_path / "no" / "a.png")


def test_links_and_labels_say_what_the_tree_says(crossing_run):
    told = explain(crossing_run, 10, track=1, others=[1])
    sketch = Sketch(told)
    links = {(link.track, link.detection): link.style for link in sketch.links}
    assert links == {(1, 0): "chosen", (2, 1): "chosen", (1, 1): "runner-up", (2, 0): "runner-up"}
    margin = f"{told.decisions[0].margin:.2f}"
    assert all(margin in link.text for link in sketch.links)
    low, high = sketch.region()
    texts = [label.text for label in sketch.labels(low, high)]
    assert "track 1, confirmed" in texts
    assert "detection 0 (line 20)" in texts
    for view in (*told.tracks, *told.detections):
        assert (low < [view.position["x"], view.position["y"]]).all()
        assert (high > [view.position["x"], view.position["y"]]).all()


def test_the_gate_ellipse_passes_through_points_at_the_threshold(crossing_run):
    told = explain(crossing_run, 10, track=1)
    sketch, view, seen = Sketch(told), told.track_view(1), told.detection_view(0)
    gate = told.decisions[0].alternatives[0].gate
    assert sketch.gate_limit() == gate.distance_limit
    off = np.array([seen.position[k] - view.position[k] for k in ("x", "y")])
    share = off @ np.linalg.solve(sketch.gate_spread(view), off)
    assert share == pytest.approx(gate.distance / gate.distance_limit, rel=1e-9)


def test_a_frame_s_picture_stays_in_one_place(crossing_run):
    told = explain(crossing_run, 10)
    assert len(drawn_decisions(told)) == 2  # one exchange
    quiet = explain(crossing_run, 6)
    assert drawn_decisions(quiet) == [quiet.decisions[0]]  # the other is elsewhere


def test_labels_do_not_cover_each_other():
    """Twelve labels at one point find twelve places."""
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure
    from matplotlib.text import Text

    figure = Figure(figsize=(9, 7), dpi=100)
    canvas = FigureCanvasAgg(figure)
    axes = figure.add_axes((0.05, 0.05, 0.9, 0.9))
    labels = [Label(f"label {k}", 0.5, 0.5, 0.0, 1.0, "#000000") for k in range(12)]
    place_labels(figure, axes, labels, [])
    figure.canvas.draw()
    boxes = [Text.get_window_extent(text, canvas.get_renderer()) for text in axes.texts]
    assert len(boxes) == 12
    for k, one in enumerate(boxes):
        assert axes.get_window_extent().contains(one.x0, one.y0)
        assert not any(one.overlaps(other) for other in boxes[k + 1 :])
