"""What activity-coefficient models state about neighbours: one model, one file, one small object."""

from localcomp.models.base import Reading, Statement, StatementInput, StatementModel
from localcomp.models.nrtl import Nrtl
from localcomp.models.quasichemical import QuasiChemical
from localcomp.models.wilson import Wilson

MODELS: tuple[StatementModel, ...] = (Wilson(), Nrtl(alpha=0.3), QuasiChemical())
"""The models a table shows when nothing else is asked."""

__all__ = [
    "MODELS",
    "Nrtl",
    "QuasiChemical",
    "Reading",
    "Statement",
    "StatementInput",
    "StatementModel",
    "Wilson",
]
