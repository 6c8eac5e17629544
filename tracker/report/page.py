"""The page: one HTML file with its style, its code and its data inside."""

from __future__ import annotations

import base64
import hashlib
import json
from collections.abc import Mapping
from importlib.resources import files
from pathlib import Path
from typing import Any

from tracker.evaluation import Scope
from tracker.log.model import Truth
from tracker.report.gather import gather
from tracker.results.folder import atomic_file

SCRIPTS = ("base.js", "stage.js", "panels.js", "plots.js", "main.js")


def write_page(
    runs: Mapping[str, str | Path],
    out: str | Path,
    truths: Mapping[str, Truth] | None = None,
    scopes: Mapping[str, Scope] | None = None,
) -> int:
    """Write the page of some runs, by name; return its size in bytes.

    Raises InputError for a folder that is no run or has no ledger, OutputError where `out`
    cannot be written, and what `evaluate` raises.
    """
    data = [
        gather(folder, (truths or {}).get(name), (scopes or {}).get(name)) | {"name": name}
        for name, folder in runs.items()
    ]
    text = page_text(data)
    with atomic_file(Path(out)) as working:
        working.write_text(text, encoding="utf-8")
    return len(text.encode())


def page_text(data: list[dict[str, Any]]) -> str:
    """The whole page. Names in the data cannot end the script element: '<' is escaped."""
    folder = files("tracker.report") / "page"
    style = (folder / "style.css").read_text(encoding="utf-8")
    code = "\n".join((folder / name).read_text(encoding="utf-8") for name in SCRIPTS)
    code = f'"use strict";\n(() => {{\n{code}\n}})();\n'
    embedded = json.dumps(data, separators=(",", ":"), ensure_ascii=False, allow_nan=False)
    embedded = embedded.replace("<", "\\u003c")
    page = (folder / "page.html").read_text(encoding="utf-8")
    parts = {
        "@POLICY@": f"default-src 'none'; script-src {_digest(code)}; style-src {_digest(style)}",
        "@STYLE@": style,
        "@CODE@": code,
        "@DATA@": embedded,
    }
    for mark, text in parts.items():
        before, _, after = page.partition(mark)
        page = before + text + after
    return page


def _digest(text: str) -> str:
    """The policy allows this very text inline, and nothing else."""
    return f"'sha256-{base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()}'"
