"""Tables of an audit for a person to read."""

from __future__ import annotations

from localcomp.audit import Audit, Outcome
from localcomp.claims import CLAIMS
from localcomp.cli.state_tables import console, put, table
from localcomp.report import CAUTION
from localcomp.standing import Standing, sentences, title

MARKS = {Outcome.HOLDS: "+", Outcome.STRAINED: "~", Outcome.FAILS: "x", Outcome.UNDECIDED: "?"}


def print_audit(audit: Audit, ranked: list[Standing]) -> None:
    """The verdict matrix, the claims' legend and the ranking in words."""
    out = console()
    heads = [str(test.claim.value) for test in CLAIMS]
    made = table("\nVerdicts by claim (best standing first)", "model, reading", *heads)
    for standing in ranked:
        found = {v.test.claim: MARKS[v.outcome] for v in audit.of(standing.model, standing.reading)}
        made.add_row(title(standing.model, standing.reading), *(found.get(test.claim, "-") for test in CLAIMS))
    put(out, made)
    out.print("+ holds   ~ strained (within three tolerances)   x fails   ? undecided   - not claimed", style="dim")
    for test in CLAIMS:
        tolerance = audit.settings.tolerance(test.key)
        out.print(f"{test.claim.value:>2}. {test.sentence}  [{test.quantity}; tolerance {tolerance:g}]", markup=False)
    out.print(
        f"\n{audit.states} states, {audit.failed_states} without a physical solution; closure {audit.closure}, "
        f"uncertainty from {', '.join(audit.companions) or 'none'}; z = {audit.z:.4g} (measured mean "
        f"{audit.z_measured:.3g})"
    )
    out.print(sentences(audit, ranked)[0], markup=False)
    costs = table(
        "\nWhat costs most, and what to split off", "model, reading", "costs most (tolerances)", "holds too within"
    )
    for s in ranked:
        if s.costliest is not None:
            worst = f"{s.costliest.test.short} ({s.cost:.1f})"
            kept = (
                "" if s.split is None else f"{s.split.keep} ({100 * s.split.kept:.0f} %): {', '.join(s.split.gained)}"
            )
            costs.add_row(title(s.model, s.reading), worst, kept)
    put(out, costs)
    untested = dict.fromkeys(
        f"claim {v.test.claim.value} {v.reason}" for v in audit.verdicts if v.reason.startswith("not tested")
    )
    for line in untested:
        out.print(line, style="yellow", markup=False)
    out.print(CAUTION, style="dim")
