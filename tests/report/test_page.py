"""The page in a real browser, from disk."""

from __future__ import annotations

import itertools
import json
import time
from pathlib import Path

import pyarrow.parquet as pq
import pytest

from tests.diagnosis.runs import CROSSING, crossing, made_run
from tracker.evaluation import Scope
from tracker.log import read_truth
from tracker.report.gather import gather
from tracker.report.page import page_text

playwright = pytest.importorskip("playwright.sync_api", reason="playwright is not installed")
CHROMIUM = next(
    (path for path in ("/usr/bin/chromium", "/usr/bin/chromium-browser") if Path(path).exists()),
    None,
)
pytestmark = pytest.mark.skipif(CHROMIUM is None, reason="chromium is not installed")
HOSTILE = "</script><img src=x onerror=alert(1)>"


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return made_run(tmp_path_factory.mktemp("report") / "run", crossing(), *CROSSING)


@pytest.fixture(scope="module")
def data(folder, tmp_path_factory):
    """A run against a truth that changes tracks half-way: one switch at least."""
    rows = pq.read_table(folder / "tracks.parquet").to_pylist()
    middle = sorted({row["frame"] for row in rows})[len({row["frame"] for row in rows}) // 2]
    first, second = sorted({row["track"] for row in rows})[:2]
    other = {first: second, second: first}
    columns = [name for name in ("left", "top", "width", "height", "x", "y") if name in rows[0]]
    lines = [",".join(["frame", "id", *columns])]
    for row in rows:
        track = row["track"] if row["frame"] < middle else other.get(row["track"], row["track"])
        name = f'"{HOSTILE}"' if track == first else f"walker {track}"
        lines.append(",".join([str(row["frame"]), name, *(str(row[c]) for c in columns)]))
    path = tmp_path_factory.mktemp("truth") / "truth.csv"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return gather(folder, read_truth(path), Scope(distance_threshold=1.0))


@pytest.fixture(scope="module")
def browser():
    with playwright.sync_playwright() as driver:
        opened = driver.chromium.launch(executable_path=CHROMIUM, args=["--no-sandbox"])
        yield opened
        opened.close()


@pytest.fixture
def visit(browser, data, tmp_path):
    """Open the page of some data; afterwards nothing was complained of, asked for or alerted."""
    path, trouble, pages = tmp_path / "page.html", [], []

    def opened(width=1280, **changes):
        path.write_text(page_text([data | changes]), encoding="utf-8")
        page = browser.new_page(viewport={"width": width, "height": 900})
        page.on("console", lambda message: trouble.append(message.text))
        page.on("pageerror", lambda error: trouble.append(str(error)))
        page.on("dialog", lambda dialog: (trouble.append("dialog"), dialog.dismiss()))
        page.on("request", lambda asked: trouble.append(asked.url) if pages else None)
        page.goto(path.as_uri())
        pages.append(page)
        return page

    yield opened
    for page in pages:
        page.close()
    assert trouble == []


def test_the_worst_error_is_one_click_away(visit, data):
    worst = data["findings"][data["worst"]]
    assert worst["error"] == "switch"
    page = visit()
    assert worst["cause"] in page.inner_text("#worst")
    page.click("#worst-go")
    assert f"frame {worst['cause_frame']}" in page.inner_text("#clock")
    assert worst["cause"] in page.inner_text("#decision")


def test_decision_panel_says_what_the_ledger_says(visit, folder):
    page = visit()
    page.keyboard.press("c")
    frame = int(page.inner_text("#clock").split()[1].strip(","))
    track = int(page.inner_text("#decision h3").split()[1].strip(","))
    ledger = pq.read_table(folder / "decisions.parquet").to_pylist()
    rows = [row for row in ledger if row["frame"] == frame and row["track"] == track]
    assert rows
    shown = page.locator("#decision table").first.locator("tr[data-row]")
    assert shown.count() == len(rows)
    for k, row in enumerate(rows):
        cells = shown.nth(k).locator("td").all_inner_texts()
        assert cells[1] == f"{row['cost']:.4f}"
        assert cells[2] == ("–" if row["distance"] is None else f"{row['distance']:.4f}")
        assert (cells[4] == "chosen") == row["chosen"]
    chosen = next(row for row in rows if row["margin"] is not None)
    assert f"Margin {chosen['margin']:.2f} nats" in page.inner_text("#decision")


def test_plays_and_steps_by_keyboard(visit):
    page = visit()
    page.keyboard.press("ArrowRight")
    page.keyboard.press("ArrowRight")
    page.keyboard.press("ArrowLeft")
    assert page.input_value("#scrub") == "1"
    page.keyboard.press(" ")
    deadline = time.monotonic() + 10.0  # the page's policy forbids playwright's own waiting
    while int(page.input_value("#scrub")) < 3 and time.monotonic() < deadline:
        page.wait_for_timeout(30)
    assert int(page.input_value("#scrub")) >= 3
    page.keyboard.press(" ")
    assert page.inner_text("#play") == "Play"
    page.keyboard.press("e")
    assert page.locator("#decision .why").count() == 1


def test_a_click_follows_an_object(visit):
    page = visit()
    page.keyboard.press("c")
    page.keyboard.press("Escape")
    assert page.inner_text("#decision h3") == "Decision"
    page.locator("#stage").scroll_into_view_if_needed()
    box = page.locator("#stage").bounding_box()
    across, down = range(20, int(box["width"]), 55), range(20, int(box["height"]), 55)
    for x, y in itertools.product(across, down):  # an object within 40 px is followed
        page.mouse.click(box["x"] + x, box["y"] + y)
        if page.inner_text("#decision h3").startswith("Track"):
            break
    assert page.inner_text("#decision h3").startswith("Track")


@pytest.mark.parametrize("width", [390, 1280])
def test_nothing_scrolls_sideways(visit, width):
    page = visit(width)
    page.click("#worst-go")
    assert page.evaluate("document.documentElement.scrollWidth") <= width


def test_hostile_names_stay_text(visit):
    page = visit(name=HOSTILE, settings=HOSTILE)
    assert page.inner_text("#name") == HOSTILE
    assert page.locator("img").count() == 0


def test_without_truth_there_is_a_page_too(visit):
    page = visit(truth=None, findings=[], scores=None, worst=None)
    assert "No truth" in page.inner_text("#worst")
    assert page.is_hidden("#worst-go")


def test_data_is_plain_json(data):
    assert json.loads(json.dumps(data, allow_nan=False))["frames"] == data["frames"]
