"""Liquid argon and krypton at 115.77 K: from measured pure liquids to neighbours in the mixture.

Calibrates both pure liquids, writes the state file of the equimolar mixture, and runs it under all
closures. Every step is also a command one can type; they are shown as they run.
"""

from __future__ import annotations

import argparse
import os
import subprocess
import sys
from pathlib import Path

from localcomp.calibrate import Calibration, calibrate, read_liquid

HERE = Path(__file__).resolve().parent
TEMPERATURE = 115.77
FRACTION = 0.5


def state_file(first: Calibration, second: Calibration) -> str:
    """The equimolar mixture: calibrated spheres, k = 0, volumes added up (no excess volume)."""
    volume = FRACTION * first.liquid.molar_volume + (1.0 - FRACTION) * second.liquid.molar_volume
    return f"""\
# Written by run.py: equimolar argon + krypton, spheres calibrated on the pure liquids.
[units]
length = "angstrom"
energy = "kelvin"

[mixture]
names = ["argon", "krypton"]
diameter = [{first.diameter:.5f}, {second.diameter:.5f}]       # angstrom
well_depth = [{first.well_depth:.4f}, {second.well_depth:.4f}]   # eps/k, kelvin
well_range = {first.liquid.well_range:g}
k = 0.0                              # Lorentz-Berthelot: nothing fitted to the mixture

[state]
temperature = {TEMPERATURE:g}               # kelvin
molar_volume = {volume:.4f}               # cm3/mol: the mean of the pure liquids, excess volume neglected
mole_fractions = [{FRACTION:g}, {1.0 - FRACTION:g}]
closure = "rhnc"
"""


def command(*words: str) -> None:
    """Show a command and run it."""
    print(f"\n$ localcomp {' '.join(words)}", flush=True)
    subprocess.run([sys.executable, "-m", "localcomp", *words], check=True, cwd=HERE)


def main() -> None:
    """Run the study."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--out", type=Path, default=HERE, help="where results go (default: this folder)")
    out = parser.parse_args().out.resolve()
    out.mkdir(parents=True, exist_ok=True)
    command("calibrate", "argon.toml")
    command("calibrate", "krypton.toml")
    argon, krypton = (calibrate(read_liquid(HERE / f"{name}.toml")) for name in ("argon", "krypton"))
    state = out / "state.toml"
    state.write_text(state_file(argon, krypton), encoding="utf-8")
    files = [os.path.relpath(out / name, HERE) for name in ("state.toml", "neighbors.csv", "distribution.png")]
    command("state", files[0], "--compare-closures", "--csv", files[1], "--plot", files[2])


if __name__ == "__main__":
    main()
