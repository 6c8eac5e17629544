"""The ledger: consistent with the answer, with brute force, and with its level."""

import numpy as np
import pyarrow.parquet as pq
import pytest

from tests.reference import margin as twin
from tracker import load_settings
from tracker.offline import associate_log
from tracker.simulation import simulate


@pytest.fixture(scope="module")
def ledgers(tmp_path_factory):
    """The same crowd with each level."""
    folder = tmp_path_factory.mktemp("ledgers")
    log = simulate("rush", seed=2).log()
    log = log.select(np.repeat(np.arange(log.frame_count) < 25, np.diff(log.offsets)))
    out = {}
    for level in ("contested", "full"):
        settings = load_settings(
            None, (f"ledger.level={level}", 'cost.terms=["likelihood", "overlap"]')
        )
        associate_log(log, settings, folder / level)
        out[level] = pq.read_table(folder / level / "decisions.parquet").to_pandas()
    return out


def test_chosen_pairs_are_one_to_one_in_every_frame(ledgers):
    pairs = ledgers["full"].query("decision == 'pair' and chosen")
    assert not pairs.duplicated(["frame", "track"]).any()
    assert not pairs.duplicated(["frame", "detection"]).any()
    others = ledgers["full"].query("decision != 'pair'")
    both = set(zip(pairs.frame, pairs.track, strict=True)) & set(
        zip(others.frame, others.track, strict=True)
    )
    assert not both


def test_terms_add_up_to_the_cost(ledgers):
    pairs = ledgers["full"].query("decision == 'pair'")
    paid = -np.log(0.9)
    both = pairs.cost_likelihood + pairs.cost_overlap
    np.testing.assert_allclose(pairs.cost, both + paid, atol=1e-12)
    np.testing.assert_allclose(pairs.cost_overlap, 8.0 * (0.5 - pairs.overlap), atol=1e-12)


def test_prices_in_the_ledger_prove_every_component(ledgers):
    """Feasible, and their sum equals the cost of what was chosen."""
    full = ledgers["full"]
    pairs = full.query("decision == 'pair'")
    assert (pairs.track_price + pairs.detection_price <= pairs.cost + 1e-9).all()
    for _, part in full.groupby(["frame", "component"]):
        chosen = part[part.chosen]
        prices = chosen.track_price.fillna(0).sum() + chosen.detection_price.fillna(0).sum()
        assert prices == pytest.approx(chosen.cost.sum(), abs=1e-9)


def test_margins_and_force_costs_equal_solving_again(ledgers):
    """From the ledger's rows alone, for all components small enough."""
    checked = 0
    for _, part in ledgers["full"].groupby(["frame", "component"]):
        pairs = part[part.decision == "pair"]
        tracks = sorted(part.track.dropna().unique())
        seen = sorted(part.detection.dropna().unique())
        if not len(pairs) > 1 or len(tracks) > 6 or len(seen) > 6:
            continue
        row = {track: i for i, track in enumerate(tracks)}
        column = {number: j for j, number in enumerate(seen)}
        allowed = np.zeros((len(tracks), len(seen)), bool)
        cost = np.zeros(allowed.shape)
        at = [row[t] for t in pairs.track], [column[d] for d in pairs.detection]
        allowed[at] = True
        cost[at] = pairs.cost
        miss = np.full(len(tracks), -np.log1p(-0.9 * 0.999))
        new = np.zeros(len(seen))
        row_column = np.full(len(tracks), -1)
        column_row = np.full(len(seen), -1)
        for pair in pairs[pairs.chosen].itertuples():
            row_column[row[pair.track]] = column[pair.detection]
            column_row[column[pair.detection]] = row[pair.track]
        of_row, of_column = twin.margins(allowed, cost, miss, new, row_column, column_row)
        forced = twin.force_costs(allowed, cost, miss, new)
        for item in part.itertuples():
            if item.decision == "new":
                expected = of_column[column[item.detection]]
                assert np.isclose(item.margin, expected, atol=1e-9) or item.margin == expected
            elif item.chosen:
                expected = of_row[row[item.track]]
                assert np.isclose(item.margin, expected, atol=1e-9) or item.margin == expected
            else:
                assert item.force_cost == pytest.approx(
                    forced[row[item.track], column[item.detection]], abs=1e-9
                )
        checked += 1
    assert checked > 50


def test_the_contested_level_keeps_contested_components_whole_and_all_that_was_chosen(ledgers):
    full, kept = ledgers["full"], ledgers["contested"]
    wanted = full[full.chosen | full.contested].reset_index(drop=True)
    shown = kept.reset_index(drop=True)
    assert len(wanted) == len(shown) < len(full)
    for name in ("frame", "decision", "track", "detection", "chosen", "cost", "margin"):
        assert wanted[name].equals(shown[name]), name


def test_contested_means_a_margin_below_the_limit_somewhere_in_the_component(ledgers):
    for _, part in ledgers["full"].groupby(["frame", "component"]):
        assert part.contested.nunique() == 1
        assert part.contested.iloc[0] == bool((part.margin < 2.3).any())


def test_row_groups_are_bounded(tmp_path):
    log = simulate("rush", seed=2).log()
    associate_log(log, load_settings(None, ("ledger.level=full",)), tmp_path / "run")
    file = pq.ParquetFile(tmp_path / "run" / "decisions.parquet")
    rows = [file.metadata.row_group(k).num_rows for k in range(file.num_row_groups)]
    assert max(rows) <= 65_536
