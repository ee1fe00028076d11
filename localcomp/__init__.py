"""Who sits next to whom in mixtures of square-well spheres, and what activity models assume about it.

Heavy modules are imported on first use, so that `localcomp --help` answers at once.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

__version__ = "0.1.0"

_HOMES = {
    "BadInput": "localcomp.errors",
    "LocalcompError": "localcomp.errors",
    "Calibration": "localcomp.calibrate",
    "calibrate": "localcomp.calibrate",
    "FirstMinimum": "localcomp.shells",
    "FixedMultiple": "localcomp.shells",
    "WellEdge": "localcomp.shells",
    "Neighbors": "localcomp.neighbors",
    "count_neighbors": "localcomp.neighbors",
    "shell_sensitivity": "localcomp.neighbors",
    "read_state": "localcomp.inputs",
}

__all__ = ["__version__", *_HOMES]  # noqa: PLE0604 - names are strings, resolved lazily below


def __getattr__(name: str) -> Any:
    home = _HOMES.get(name)
    if home is None:
        raise AttributeError(f"module 'localcomp' has no attribute {name!r}")
    return getattr(import_module(home), name)
