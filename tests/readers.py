"""Outside numbers from tests/data: first line the source, then a header, then rows."""

from __future__ import annotations

import csv
from pathlib import Path

DATA = Path(__file__).parent / "data"


def read(name: str) -> list[dict[str, str]]:
    lines = (DATA / f"{name}.csv").read_text(encoding="utf-8").splitlines()
    assert lines[0].startswith("# "), "the first line of a data file names its source"
    return list(csv.DictReader(line for line in lines if not line.startswith("#")))


def numbers(row: dict[str, str]) -> dict[str, float]:
    return {key: float(value) for key, value in row.items() if value not in ("", None) and _is_number(value)}


def _is_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True
