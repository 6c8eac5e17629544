"""Read areas that are not scored: TOML, GeoJSON or well-known text."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path
from typing import Any

import shapely
from shapely.errors import ShapelyError
from shapely.geometry import Polygon, shape
from shapely.geometry.base import BaseGeometry
from shapely.validation import explain_validity

from tracker.errors import InputError

FORMS = "Write [[region]] and points = [[x, y], ...] in TOML, or give GeoJSON or WKT polygons."


def read_regions(path: Path) -> tuple[BaseGeometry, ...]:
    """The polygons of a file, in the coordinates of the truth.

    A TOML file (.toml) has tables ``[[region]]`` with ``points = [[x, y], ...]``; .json and
    .geojson hold GeoJSON; any other file holds one polygon in well-known text a line, with # for
    comments.

    Raises InputError, saying which region is wrong.
    """
    try:
        text = path.read_text(encoding="utf-8")
    except FileNotFoundError:
        raise InputError("there is no such file", path=path) from None
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(f"cannot be read: {error}", path=path) from None
    suffix = path.suffix.lower()
    if suffix == ".toml":
        found = _from_toml(text, path)
    elif suffix in (".json", ".geojson"):
        found = _from_geojson(text, path)
    else:
        found = _from_wkt(text, path)
    if not found:
        raise InputError("holds no region", path=path, remedy=FORMS)
    for number, region in enumerate(found, 1):
        _check(region, number, path)
    return tuple(found)


def _from_toml(text: str, path: Path) -> list[BaseGeometry]:
    try:
        tables = tomllib.loads(text).get("region", [])
    except tomllib.TOMLDecodeError as error:
        raise InputError(f"cannot be read as TOML: {error}", path=path) from None
    if not isinstance(tables, list):
        raise InputError("region is not a list of tables", path=path, remedy=FORMS)
    out: list[BaseGeometry] = []
    for number, table in enumerate(tables, 1):
        try:
            out.append(Polygon(table["points"]))
        except (KeyError, TypeError, ValueError, ShapelyError) as error:
            raise _unreadable(number, error, path) from None
    return out


def _from_geojson(text: str, path: Path) -> list[BaseGeometry]:
    try:
        found = json.loads(text)
    except ValueError as error:
        raise InputError(f"cannot be read as JSON: {error}", path=path) from None
    out = []
    for number, geometry in enumerate(_geometries(found), 1):
        try:
            out.append(shape(geometry))
        except (KeyError, TypeError, ValueError, AttributeError, ShapelyError) as error:
            raise _unreadable(number, error, path) from None
    return out


def _geometries(found: Any) -> list[Any]:
    if isinstance(found, dict) and found.get("type") == "FeatureCollection":
        return [part for item in found.get("features") or [] for part in _geometries(item)]
    if isinstance(found, dict) and found.get("type") == "Feature":
        return [found.get("geometry")]
    return [found]


def _from_wkt(text: str, path: Path) -> list[BaseGeometry]:
    out = []
    for number, line in enumerate(text.splitlines(), 1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        try:
            out.append(shapely.from_wkt(line))
        except ShapelyError as error:
            raise InputError(
                f"is no well-known text: {error}",
                path=path, line=number, found=line.strip()[:80], remedy=FORMS,
            ) from None  # fmt: skip
    return out


def _unreadable(number: int, error: Exception, path: Path) -> InputError:
    reason = f"{type(error).__name__}: {error}"
    return InputError(f"region {number} cannot be read ({reason})", path=path, remedy=FORMS)


def _check(region: BaseGeometry, number: int, path: Path) -> None:
    if region.geom_type not in ("Polygon", "MultiPolygon") or region.is_empty:
        raise InputError(
            f"region {number} is no polygon", path=path, found=region.geom_type, remedy=FORMS
        )
    if not region.is_valid:
        raise InputError(
            f"region {number} is no proper polygon: {explain_validity(region)}", path=path
        )
