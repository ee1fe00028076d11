"""What a study file may say about its audit: the [audit] table."""

from __future__ import annotations

from dataclasses import dataclass, field

from localcomp.claims import CLAIMS, TOLERANCE_KEYS
from localcomp.errors import Problem
from localcomp.models import LATTICE_COORDINATION, MODELS, ActivityModel, models_named
from localcomp.tables import Table, as_number

MEASURED = "measured"


@dataclass(frozen=True)
class AuditSettings:
    """How a class is judged, fixed before it is solved.

    Attributes
    ----------
    models : tuple of ActivityModel
    z : float or None
        Lattice coordination number; None: measured, the mean number of neighbours over the class.
    companions : tuple of str
        Closures whose difference from the judged one is the closure uncertainty; empty: chosen (`companions_of`).
    tolerances : dict
        By the claims' keys; what is not there has its default.
    """

    models: tuple[ActivityModel, ...] = MODELS
    z: float | None = LATTICE_COORDINATION
    companions: tuple[str, ...] = ()
    tolerances: dict[str, float] = field(default_factory=dict)

    def tolerance(self, key: str) -> float:
        """Of one claim."""
        default = {test.key: test.tolerance for test in CLAIMS}[key]
        return self.tolerances.get(key, default)


def companions_of(closures: tuple[str, ...]) -> tuple[str, ...]:
    """Closures to hold the first one against: the others listed, or the next best against simulation.

    RHNC is held against HNC and any other closure against RHNC: of the closures here these two are
    closest to simulation (own simulations, README).
    """
    if len(closures) > 1:
        return closures[1:]
    return ("hnc",) if closures[0] == "rhnc" else ("rhnc",)


def read_audit(table: Table) -> AuditSettings:
    """The [audit] table of a study; mistakes are added to the table's problems."""
    table.known(("models", "z", "tolerances"))
    models = named_models(table.content.get("models", "all"), table)
    z: float | None = LATTICE_COORDINATION
    if "z" in table.content and table.content["z"] != MEASURED:
        given = as_number(table.content["z"])
        if given is None or not 2.0 < given <= 100.0:
            table.complain("z", table.content["z"], f'a number above 2, up to 100, or "{MEASURED}"')
        else:
            z = given
    elif "z" in table.content:
        z = None
    inner = Table(table.file, "audit.tolerances", table.content.get("tolerances", {}), table.problems)
    inner.known(TOLERANCE_KEYS)
    tolerances = {}
    for key in TOLERANCE_KEYS:
        value = inner.optional_number(key, "a number inside (0, 10]", lambda v: 0.0 < v <= 10.0)
        if value is not None:
            tolerances[key] = value
    return AuditSettings(models, z, (), tolerances)


def named_models(raw: object, table: Table) -> tuple[ActivityModel, ...]:
    """Models by name; "all" or a list of names or families."""
    allowed = f'"all", or a list out of: {", ".join(model.name for model in MODELS)}; or families: nrtl, random'
    if raw == "all":
        return MODELS
    names = [raw] if isinstance(raw, str) else raw
    if not isinstance(names, list) or not names or not all(isinstance(name, str) for name in names):
        table.complain("models", raw, allowed)
        return MODELS
    try:
        return models_named([str(name) for name in names])
    except KeyError as error:
        table.complain("models", error.args[0], allowed)
        return MODELS


def models_option(text: str) -> tuple[ActivityModel, ...]:
    """Models of a comma-separated command-line option.

    Raises
    ------
    BadInput
        If a name is no model's.
    """
    from localcomp.errors import BadInput

    problems: list[Problem] = []
    table = Table("command line", "", {}, problems)
    names = [name.strip() for name in text.split(",") if name.strip()]
    models = named_models("all" if names == ["all"] else names, table)
    if problems:
        raise BadInput([Problem("command line", "--models", p.value, p.allowed) for p in problems])
    return models
