"""Do margins tell which decisions are wrong, and are they honest odds?

Crossing scenes: groups of three objects meet at one place with noise, misses and clutter, and the
engine knows the true parameters (likelihood cost). A pair is wrong if its detection comes from
another object than the track's detection before. Prints the area under the ROC curve of 'a small
margin predicts a wrong pair', and reliability tables of margins and of identity confidence.

    python scripts/study_margins.py [--picture reliability.png]
"""

from __future__ import annotations

import argparse
from itertools import pairwise

import numpy as np
from scipy.stats import rankdata

from tracker import Engine, Frame, Kind, load_settings

FRAMES = 60
STEP = 0.2  # s
SIGMA = 0.5  # m
Q = 0.3  # (m/s²)² s
DETECTED = 0.9
CLUTTER = 4e-4  # a square metre and frame
SIDE = 80.0  # m


def settings():
    """The engine's settings, matched to the scene."""
    return load_settings(
        None,
        (
            "cost.terms=['likelihood']",
            f"cost.new_density={CLUTTER}",
            f"sensor.detection_probability={DETECTED}",
            "gate.probability=0.999",
            f"measurement.position_sigma={SIGMA}",
            f"motion.acceleration_noise={np.sqrt(Q)}",
            "motion.initial_speed_sigma=4",
            "lifecycle.coast_seconds=2",
            "lifecycle.confirm_hits=3",
            "lifecycle.confirm_window=4",
        ),
    )


def scene(seed: int) -> list[tuple[Frame, np.ndarray]]:
    """Frames with the object behind each detection, -1 for clutter."""
    rng = np.random.default_rng(seed)
    objects = 3
    course = rng.uniform(0, 2 * np.pi) + rng.uniform(0.25, 0.6) * np.arange(objects)
    velocity = 3.0 * np.column_stack((np.cos(course), np.sin(course)))
    place = -velocity * FRAMES * STEP / 2 + rng.normal(0, 1.0, (objects, 2))
    cov = Q * np.array([[STEP**3 / 3, STEP**2 / 2], [STEP**2 / 2, STEP]])
    root = np.linalg.cholesky(cov)
    frames = []
    for k in range(FRAMES):
        noise = np.einsum("ab,obk->oak", root, rng.normal(size=(objects, 2, 2)))
        place = place + STEP * velocity + noise[:, 0]
        velocity = velocity + noise[:, 1]
        seen = np.flatnonzero(rng.random(objects) < DETECTED)
        false = rng.poisson(CLUTTER * SIDE**2)
        z = np.concatenate(
            (
                place[seen] + rng.normal(0, SIGMA, (len(seen), 2)),
                rng.uniform(-SIDE / 2, SIDE / 2, (false, 2)),
            )
        )
        origin = np.concatenate((seen, np.full(false, -1)))
        frames.append((Frame.of_points(k + 1, k * STEP, z), origin))
    return frames


def decisions(scenes: int) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Margins and wrongness of all pairs; final confidence and purity of all confirmed tracks."""
    margin, wrong, confidence, pure = [], [], [], []
    for seed in range(scenes):
        engine = Engine(settings(), Kind.POINT)
        last: dict[int, int] = {}
        erred: dict[int, bool] = {}
        final: dict[int, float] = {}
        for frame, origin in scene(seed):
            result = engine.step(frame)
            tier = result.tiers[0]
            confirmed = result.prediction.state != 0
            for row, column in enumerate(tier.solution.answer.row_column):
                track = int(result.considered[row])
                if column < 0:
                    continue
                here = int(origin[column])
                if confirmed[row] and last.get(track, -1) >= 0:
                    bad = here != last[track]
                    margin.append(tier.solution.row_margin[row])
                    wrong.append(bad)
                    erred[track] = erred.get(track, False) or bad
                if here >= 0:
                    last[track] = here
            for track, column in zip(result.track, result.detection, strict=True):
                if column >= 0 and int(track) not in last:
                    last[int(track)] = int(origin[column])
            for track, state, value in zip(
                result.track, result.state, result.confidence, strict=True
            ):
                if state != 0:
                    final[int(track)] = float(value)
        for track, value in final.items():
            if track in erred:
                confidence.append(value)
                pure.append(not erred[track])
    return np.array(margin), np.array(wrong), np.array(confidence), np.array(pure)


def area_under_roc(score: np.ndarray, positive: np.ndarray) -> float:
    """Chance that a random positive has the higher score (Mann and Whitney 1947)."""
    ranks = rankdata(score)
    count = positive.sum()
    return float((ranks[positive].sum() - count * (count + 1) / 2) / (count * (~positive).sum()))


def margin_table(margin: np.ndarray, wrong: np.ndarray) -> list[tuple[float, float, int]]:
    """(stated probability of being wrong, observed share, decisions) by margin."""
    stated = 1.0 / (1.0 + np.exp(margin))
    rows = []
    edges = [0.0, 0.5, 1.0, 2.0, 3.0, 4.5, 6.0, np.inf]
    print(f"{'margin, nats':>14} {'decisions':>10} {'stated wrong':>13} {'observed':>9}")
    for low, high in pairwise(edges):
        inside = (margin >= low) & (margin < high)
        if inside.any():
            rows.append((stated[inside].mean(), wrong[inside].mean(), int(inside.sum())))
            expected, observed, count = rows[-1]
            print(f"{low:6.1f} - {high:5.1f} {count:10d} {expected:12.2%} {observed:9.2%}")
    return rows


def confidence_table(confidence: np.ndarray, pure: np.ndarray) -> None:
    print(f"{'confidence':>14} {'tracks':>10} {'stated':>13} {'observed':>9}")
    edges = np.array([0.0, 0.2, 0.4, 0.6, 0.8, 1.001])
    for low, high in pairwise(edges):
        inside = (confidence >= low) & (confidence < high)
        if inside.any():
            print(
                f"{low:6.1f} - {min(high, 1):5.1f} {inside.sum():10d} "
                f"{confidence[inside].mean():12.1%} {pure[inside].mean():9.1%}"
            )


def draw(rows: list[tuple[float, float, int]], path: str) -> None:
    """Reliability diagram: stated against observed share of wrong decisions."""
    import matplotlib

    matplotlib.use("Agg")
    import matplotlib.pyplot as plt

    stated, observed, count = np.array(rows).T
    error = np.sqrt(observed * (1 - observed) / count)
    figure, axes = plt.subplots(figsize=(5, 4.5), layout="constrained")
    top = max(stated.max(), observed.max()) * 1.1
    axes.plot([0, top], [0, top], color="0.6", linestyle="--", label="honest odds")
    axes.errorbar(stated, observed, 2 * error, fmt="o-", color="#0072B2", label="decisions")
    axes.set_xlabel("stated probability of being wrong, 1 / (1 + exp(margin))")
    axes.set_ylabel("observed share of wrong pairs")
    axes.legend()
    figure.savefig(path, dpi=150)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--scenes", type=int, default=300)
    parser.add_argument("--picture", help="PNG of the reliability diagram")
    options = parser.parse_args()
    margin, wrong, confidence, pure = decisions(options.scenes)
    print(f"{len(margin)} pairs of confirmed tracks, {wrong.sum()} wrong")
    print(f"area under the ROC curve: {area_under_roc(-margin, wrong):.3f}\n")
    rows = margin_table(margin, wrong)
    print()
    confidence_table(confidence, pure)
    if options.picture:
        draw(rows, options.picture)


if __name__ == "__main__":
    main()
