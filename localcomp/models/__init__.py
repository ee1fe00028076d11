"""Activity-coefficient models: what they state about neighbours and about ln gamma. One model, one file.

Every module here that defines `OFFERED` is found by itself; the order is that of the sources.
"""

from __future__ import annotations

import importlib
import pkgutil

from localcomp.models.base import (
    LATTICE_COORDINATION,
    ActivityModel,
    Adjustable,
    Claim,
    ModelInput,
    Reading,
    Statement,
    compare,
    excess_energy,
    ln_gamma,
    local_fractions,
)
from localcomp.models.nrtl import Nrtl
from localcomp.models.quasichemical import QuasiChemical
from localcomp.models.wilson import Wilson


def _offered() -> tuple[ActivityModel, ...]:
    found = []
    for module in pkgutil.iter_modules(__path__, __name__ + "."):
        found += list(getattr(importlib.import_module(module.name), "OFFERED", ()))
    return tuple(sorted(found, key=lambda model: (model.year, model.name)))


MODELS: tuple[ActivityModel, ...] = _offered()
"""All models."""
TABLE_MODELS: tuple[ActivityModel, ...] = (Wilson(), Nrtl(alpha=0.3), QuasiChemical())
"""The models the table of a single state shows."""


def models_named(names: list[str]) -> tuple[ActivityModel, ...]:
    """Models by name, in the order of `MODELS`; a family name ("nrtl", "random") means all of it.

    Raises
    ------
    KeyError
        With the first name that is no model's.
    """
    chosen = set()
    for name in names:
        hits = {m.name for m in MODELS if m.name == name} or {m.name for m in MODELS if m.name.startswith(name + "-")}
        if not hits:
            raise KeyError(name)
        chosen |= hits
    return tuple(m for m in MODELS if m.name in chosen)


__all__ = [
    "LATTICE_COORDINATION",
    "MODELS",
    "TABLE_MODELS",
    "ActivityModel",
    "Adjustable",
    "Claim",
    "ModelInput",
    "Nrtl",
    "QuasiChemical",
    "Reading",
    "Statement",
    "Wilson",
    "compare",
    "excess_energy",
    "ln_gamma",
    "local_fractions",
    "models_named",
]
