"""Are the filter's covariances honest? NEES against truth, NIS of the chosen pairs.

Bar-Shalom, Li and Kirubarajan 2001, §5.4. With an honest covariance the squared error in units of
it (NEES, eᵀ P⁻¹ e) and the squared innovation in units of its own (NIS, d²) follow chi-square
distributions, with as many degrees of freedom as there are dimensions. Larger is optimistic: the
filter believes itself too much; smaller is pessimistic.

The interval of the mean is for independent rows. Those of one track are correlated in time, so it
is narrower than it should be; the share inside the 95% region does not suffer from that. Rows that
are too far off to be paired at all are missing here, which flatters NEES; the gate does the same
to NIS, whose expected mean is corrected for it.
"""

from __future__ import annotations

from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow.compute as pc
import pyarrow.parquet as pq
from scipy.stats import chi2

from tracker.errors import InputError
from tracker.evaluation.counts import count
from tracker.evaluation.couples import find_couples
from tracker.evaluation.scope import Scope, close_pairs, scored_rows
from tracker.log.model import Floats, Truth
from tracker.results.read import read_run, square_matrices
from tracker.settings import load_settings

INSIDE = 0.95


@dataclass(frozen=True, slots=True)
class ChiSquareCheck:
    """Squared distances against their chi-square distribution; None where there are no rows.

    expected : mean if the covariances are honest.   lower, upper : two-sided 95% interval of the
    mean of as many independent rows.   share_inside : rows in the region that should hold 95% (of
    what the gate lets through).
    """

    rows: int
    dimension: int
    mean: float | None
    expected: float
    lower: float | None
    upper: float | None
    share_inside: float | None

    @property
    def verdict(self) -> str:
        """`consistent`, `optimistic`, `pessimistic` or `no rows`."""
        if self.mean is None or self.lower is None or self.upper is None:
            return "no rows"
        if self.mean > self.upper:
            return "optimistic"
        return "pessimistic" if self.mean < self.lower else "consistent"

    def as_dict(self) -> dict[str, Any]:
        return asdict(self) | {"verdict": self.verdict}


def check_squares(squares: Floats, dimension: int, gate: float | None = None) -> ChiSquareCheck:
    """Compare (n,) squared distances with chi-square.

    gate : probability at which they were cut off, None if they were not.

    A cut-off distribution has mean m·F_{m+2}(γ)/F_m(γ); its variance follows from F_{m+4} in the
    same way, and the interval of its mean is the normal one. Otherwise n times the mean is
    chi-square with n·m degrees of freedom.
    """
    n, m = len(squares), dimension
    tail = (1.0 - INSIDE) / 2.0
    if gate is None:
        expected, within = float(m), float(chi2.ppf(INSIDE, m))
        bounds = chi2.ppf((tail, 1.0 - tail), n * m) / n if n else (None, None)
    else:
        limit = chi2.ppf(gate, m)
        expected = float(m * chi2.cdf(limit, m + 2) / gate)
        second = m * (m + 2) * chi2.cdf(limit, m + 4) / gate
        spread = 1.959964 * np.sqrt((second - expected**2) / n) if n else 0.0
        bounds = (expected - spread, expected + spread) if n else (None, None)
        within = float(chi2.ppf(INSIDE * gate, m))
    lower, upper = (None if bound is None else float(bound) for bound in bounds)
    return ChiSquareCheck(
        n,
        m,
        float(squares.mean()) if n else None,
        expected,
        lower,
        upper,
        float((squares <= within).mean()) if n else None,
    )


def check_run(folder: Path, truth: Truth, scope: Scope | None = None) -> dict[str, ChiSquareCheck]:
    """`nees` of the paired rows of a run, and `nis` of its ledger's chosen pairs if it has one.

    Raises InputError if `folder` is no run with covariances, and what `evaluate` raises.
    """
    scope = scope or Scope()
    tracks = read_run(folder)
    both = scored_rows(tracks, truth, scope)
    found = count(both, find_couples(both), close_pairs(both, truth.kind, scope))
    paired = found.match >= 0
    row = both.track_row[found.scene.pair_row[found.match[paired]]]
    estimate, covariance = _estimates(folder, tracks.kind.dimension)
    error = truth.z[both.truth_row[paired]] - estimate[row]
    squares = np.einsum(
        "ni,ni->n", error, np.linalg.solve(covariance[row], error[..., None])[..., 0]
    )
    checks = {"nees": check_squares(squares, tracks.kind.dimension)}
    ledger = folder / "decisions.parquet"
    if ledger.is_file():
        gate = load_settings(folder / "settings.toml", ()).gate.probability
        checks["nis"] = check_squares(_innovations(ledger), tracks.kind.dimension, gate)
    return checks


def _estimates(folder: Path, dimension: int) -> tuple[Floats, Floats]:
    """(n, d) estimates and (n, d, d) covariances of the rows of tracks.parquet."""
    path = folder / "tracks.parquet"
    try:
        table = pq.read_table(path, columns=["estimate", "covariance"])
    except (OSError, KeyError, ValueError) as error:
        raise InputError(f"has no covariances: {error}", path=path) from None
    estimate = pc.list_flatten(table["estimate"]).to_numpy().reshape(-1, dimension)
    return estimate, square_matrices(table["covariance"], dimension)


def _innovations(ledger: Path) -> Floats:
    """(n,) d² of the chosen pairs."""
    try:
        table = pq.read_table(ledger, columns=["chosen", "distance"])
    except (OSError, KeyError, ValueError) as error:
        raise InputError(f"cannot be read as a ledger: {error}", path=ledger) from None
    squares = table["distance"].to_numpy()[table["chosen"].to_numpy()]
    return squares[np.isfinite(squares)]


def checks_table(checks: dict[str, dict[str, ChiSquareCheck]]) -> str:
    """One line a sequence and kind of check."""
    rows = [("sequence", "check", "rows", "mean", "expected", "95% interval", "inside 95%", "")]
    for name, found in checks.items():
        for kind, check in found.items():
            some = check.mean is not None
            rows.append(
                (
                    name,
                    kind.upper(),
                    str(check.rows),
                    f"{check.mean:.3f}" if some else "-",
                    f"{check.expected:.3f}",
                    f"{check.lower:.3f} to {check.upper:.3f}" if some else "-",
                    f"{100 * (check.share_inside or 0.0):.1f}%" if some else "-",
                    check.verdict,
                )
            )
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]))]
    return "\n".join(
        "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip()
        for row in rows
    )
