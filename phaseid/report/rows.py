"""The candidates as flat rows, for CSV and spreadsheets."""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping, Sequence
from typing import Any

COLUMNS = (
    "image",
    "cluster",
    "name",
    "grey_mean",
    "grey_se",
    "clipped",
    "area_fraction",
    "rank",
    "phase",
    "formula",
    "database",
    "mean_atomic_number",
    "eta",
    "predicted_grey",
    "predicted_grey_sd",
    "probability",
    "group",
    "none_of_these",
    "hazard",
)


def rows(documents: Sequence[Mapping[str, Any]]) -> list[dict[str, Any]]:
    """One row per candidate of every cluster of every document."""
    found = []
    for document in documents:
        for cluster in document["clusters"]:
            shared = {
                "image": document["image"]["path"],
                "cluster": cluster["id"],
                "name": cluster["name"],
                **{
                    key: cluster[key]
                    for key in ("grey_mean", "grey_se", "clipped", "area_fraction", "none_of_these")
                },
            }
            for rank, candidate in enumerate(cluster["candidates"], start=1):
                own = {key: candidate[key] for key in COLUMNS if key in candidate}
                found.append({**shared, "rank": rank, **own})
    return found


def to_csv(documents: Sequence[Mapping[str, Any]]) -> str:
    """CSV text (RFC 4180) of `rows`, with a heading line."""
    stream = io.StringIO(newline="")
    writer = csv.DictWriter(stream, COLUMNS, extrasaction="ignore")
    writer.writeheader()
    for row in rows(documents):
        writer.writerow({key: _safe(value) for key, value in row.items()})
    return stream.getvalue()


def _safe(value: Any) -> Any:
    """Keep a spreadsheet from taking a text for a formula."""
    if isinstance(value, str) and value[:1] in "=+-@\t\r":
        return "'" + value
    return value
