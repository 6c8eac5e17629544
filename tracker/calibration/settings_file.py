"""Calibrated settings as TOML, each measured value with its evidence, and as a table."""

from __future__ import annotations

from pathlib import Path

from tracker.calibration.calibrate import Calibration
from tracker.calibration.evidence import short
from tracker.results.folder import atomic_file
from tracker.settings.files import settings_as_toml

CAUTION = (
    "Measured settings hold for data like those they come from, and wrong tracks can hurt people: "
    "check them on other data, and follow the rules and licensed practice that apply."
)


def calibrated_toml(found: Calibration) -> str:
    """The complete settings; a comment above each measured value says what it rests on."""
    said = {item.setting: item.sentence for item in found.evidence if "." in item.setting}
    lines = [f"# {found.source}.", f"# {CAUTION}"]
    lines += [f"# {line}" for line in consistency_lines(found)] + [""]
    section = ""
    for line in settings_as_toml(found.settings).splitlines():
        if line.startswith("["):
            section = line.strip("[]")
        name = f"{section}.{line.partition(' = ')[0]}"
        if not line.startswith("#") and name in said:
            lines.append(f"#   {said[name]}")
        lines.append(line)
    return "\n".join(lines) + "\n"


def write_settings(found: Calibration, path: Path) -> None:
    """Write `calibrated_toml`, all of it or nothing.

    Raises OutputError where that cannot be written.
    """
    with atomic_file(path) as working:
        working.write_text(calibrated_toml(found), encoding="utf-8")


def consistency_lines(found: Calibration) -> list[str]:
    """What held-out frames say of the covariances."""
    facts = found.consistency
    if not facts["count"]:
        return ["No innovations in the last third of the frames: consistency is not known."]
    low, mean, high = facts["low"], facts["mean"], facts["high"]
    verdict = "inside" if low <= mean <= high else "OUTSIDE"
    line = (
        f"Mean NIS of the last third of the frames, noise fitted to the rest: {mean:.3f}, "
        f"{verdict} its 95% bounds {low:.3f} to {high:.3f} ({facts['count']} innovations)."
    )
    if verdict == "OUTSIDE":
        more = "wider than real" if mean < low else "narrower than real"
        line += f" Covariances are {more} there."
    return [line, f"Beyond the 99.9% gate: {facts['outside']:.2%} of them (0.10% expected)."]


def table(found: Calibration) -> str:
    """Measured values, then P_D and true detections by bins."""
    rows = [("value", "measured", "95% interval", "observations", "")]
    for item in found.evidence:
        interval = item.interval
        rows.append((
            item.setting,
            "default" if item.kept else short(item.value),
            "" if interval is None or item.kept else f"{interval[0]:.4g} to {interval[1]:.4g}",
            str(item.count),
            item.method,
        ))  # fmt: skip
    for share in found.shares:
        low, high = share.interval
        of = "true detections" if share.of == "score" else "detected"
        rows.append((
            f"{of}, {share.of} {share.low:.4g} to {share.high:.4g}",
            short(share.value), f"{low:.4g} to {high:.4g}", str(share.trials), "Wilson 1927",
        ))  # fmt: skip
    widths = [max(len(row[k]) for row in rows) for k in range(4)]
    lines = []
    for row in rows:
        cells = [row[0].ljust(widths[0])]
        cells += [row[k].rjust(widths[k]) for k in range(1, 4)]
        lines.append("  ".join([*cells, row[4]]).rstrip())
    return "\n".join([*lines, "", *consistency_lines(found)])
