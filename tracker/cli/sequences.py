"""What commands that score have in common: tracks and truth by sequence name."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from tracker.errors import InputError, UsageError

if TYPE_CHECKING:
    from tracker.log.model import Truth
    from tracker.results.tracks import Tracks

    Source = tuple[Path, Tracks]


def sources_by_name(paths: list[Path]) -> dict[str, Source]:
    """Run folder or file, and its tracks, by sequence name, in the order given."""
    from tracker.log import read_track_file
    from tracker.results import is_run, read_run

    read: list[tuple[Path, Tracks]] = []
    for path in paths:
        runs = [path]
        if path.is_dir() and not is_run(path):
            runs = sorted(inner for inner in path.iterdir() if is_run(inner))
            if not runs:
                raise InputError(
                    "is neither a run folder nor a folder of them",
                    path=path,
                    remedy="Make one with 'margent associate LOG --out DIR'.",
                )
        read += [(run, read_run(run) if is_run(run) else read_track_file(run)) for run in runs]
    names = _names([(path, tracks.name) for path, tracks in read])
    return dict(zip(names, read, strict=True))


def pairs_by_name(a: Path, b: Path) -> dict[str, tuple[Source, Source]]:
    """The sources of two runs by sequence name, in A's order.

    Sequences go together by name; a single one of each goes together whatever its name. Raises
    UsageError where one has no partner.
    """
    of_a, of_b = sources_by_name([a]), sources_by_name([b])
    if len(of_a) == len(of_b) == 1:
        other = next(iter(of_b.values()))
        return {name: (one, other) for name, one in of_a.items()}
    alone = [f"'{n}' is in {a} alone" for n in of_a if n not in of_b]
    alone += [f"'{n}' is in {b} alone" for n in of_b if n not in of_a]
    if alone:
        more = f" (and {len(alone) - 3} more)" if len(alone) > 3 else ""
        raise UsageError(
            f"the runs have different sequences: {'; '.join(alone[:3])}{more}; compare single "
            "runs, or associate both over the same logs"
        )
    return {name: (one, of_b[name]) for name, one in of_a.items()}


def _names(named: list[tuple[Path, str]]) -> list[str]:
    """A name for each: its own, the folder it is in where names are equal, else its path."""
    own = [name for _, name in named]
    folder = [(path if path.is_dir() else path.absolute().parent).name for path, _ in named]
    names = [
        name if own.count(name) == 1 else at if folder.count(at) == 1 else str(path)
        for name, at, (path, _) in zip(own, folder, named, strict=True)
    ]
    twice = next((name for name in names if names.count(name) > 1), None)
    if twice is not None:
        raise UsageError(f"two sets of tracks are called '{twice}'; give each once")
    return names


def truths_by_name(given: list[str], names: list[str], *, strict: bool = False) -> dict[str, Truth]:
    """The truth of each sequence, from files in order, NAME=FILE, or a folder.

    strict : whether a row that would be rejected is an error.
    """
    from tracker.log import read_truth

    parts = {text: text.partition("=") for text in given}
    named = {name: file for name, equals, file in parts.values() if equals and name in names}
    plain = [text for text in given if not (parts[text][1] and parts[text][0] in names)]
    for text in plain:
        name, equals, file = parts[text]
        if equals and not Path(text).exists() and Path(file).exists():
            raise UsageError(f"there is no sequence '{name}' here ({', '.join(names)})")
    if len(plain) == 1 and not named and (len(names) > 1 or Path(plain[0]).is_dir()):
        folder = Path(plain[0])
        if folder.is_dir() and not list(folder.glob("truth.*")):
            return {name: read_truth(_truth_in(folder, name), strict=strict) for name in names}
    left = [name for name in names if name not in named]
    if len(plain) == 1 and len(left) > 1:
        plain *= len(left)  # several runs over one sequence share its truth
    if len(plain) != len(left):
        raise UsageError(
            f"{len(names)} {'sequence' if len(names) == 1 else 'sequences'} ({', '.join(names)}) "
            f"but {len(given)} truth files; give one each in order, NAME=FILE, or a folder"
        )
    paths = named | dict(zip(left, plain, strict=True))
    return {name: read_truth(Path(paths[name]), strict=strict) for name in names}


def _truth_in(folder: Path, name: str) -> Path:
    for place in (folder / name, folder):
        for pattern in ("truth.*", f"{name}.*") if place == folder / name else (f"{name}.*",):
            files = sorted(place.glob(pattern)) if place.is_dir() else []
            if files:
                return files[0]
    raise InputError(
        f"no truth for the sequence '{name}'",
        path=folder,
        remedy=f"Expected {name}/truth.* or {name}.* in it.",
    )
