"""Tables of a study for a person to read."""

from __future__ import annotations

from localcomp.classtable import Summary
from localcomp.cli.state_tables import console, put, table
from localcomp.study import Study


def print_summary(study: Study, found: Summary) -> None:
    """The class at a glance."""
    out = console()
    states = ", ".join(f"{count} {status}" for status, count in sorted(found.counts.items()))
    out.print(f"{study.name}: {len(study.cases)} states: {states}")
    made = table("\nOver the solved states", "quantity", "smallest", "median", "largest")
    for name, low, middle, high in found.ranges:
        made.add_row(name, f"{low:.4f}", f"{middle:.4f}", f"{high:.4f}")
    put(out, made)
    out.print(f"largest numerical error of a neighbour count: {found.largest_error:.1e} relative", style="dim")
    for (closure, status), count in sorted(found.failures.items()):
        out.print(f"{closure}: {count} states {status.replace('_', ' ')}", style="yellow")
