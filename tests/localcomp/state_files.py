"""Valid files and small edits of them, shared by the tests of this folder."""

from __future__ import annotations

STATE = """\
[mixture]
names = ["small", "large"]
diameter = [1.0, 1.5]
well_depth = [1.0, 1.5]
well_range = 1.5
k = 0.1
l = 0.0

[state]
temperature = 2.0
packing_fraction = 0.40
mole_fractions = [0.5, 0.5]
closure = "rhnc"

[shell]
rule = "well_edge"

[numerics]
accuracy = 1e-4
"""

TERNARY = """\
[units]
length = "angstrom"
energy = "kelvin"

[mixture]
names = ["a", "b", "c"]
diameter = [3.3, 3.5, 4.0]
well_depth = [115.0, 163.0, 200]
well_range = [1.5, 1.6, 1.5]
k = [[0.0, 0.1, 0.0], [0.1, 0.0, 0.05], [0.0, 0.05, 0.0]]

[[mixture.pairs]]
between = ["a", "c"]
well_depth = 150.0
diameter = 3.6
well_range = 1.4

[state]
temperature = 300
molar_volume = 40.5
mole_fractions = [0.2, 0.3, 0.5]
closure = "HNC"

[shell]
rule = "multiple"
multiple = 1.4
"""

LIQUID = """\
[fluid]
name = "argon"
temperature = 87.3
molar_volume = 28.628
residual_energy = -5786.0
pressure = 101.302
well_range = 1.5
closure = "rhnc"
source = "a table"
"""

STUDY = """\
[study]
name = "two pairs"

[class]
size_ratio = [1.0, 1.25]
energy_ratio = 2.0
k = [0.1]
well_range = 1.5

[conditions]
temperature = { from = 1.5, to = 3.0, steps = 3 }
temperature_reference = "mean"
packing_fraction = 0.40
composition = [0.0, 0.5]
closures = ["rhnc"]

[shell]
rule = "well_edge"

[numerics]
accuracy = 1e-5
"""

NO_SOLUTION = """\
[mixture]
names = ["a", "b"]
diameter = [1.0, 1.0]
well_depth = [1.0, 1.0]
k = 0.2

[state]
temperature = 1.0
packing_fraction = 0.40
mole_fractions = [0.5, 0.5]
closure = "py"
"""


def with_line(text: str, key: str, line: str) -> str:
    """The text with the one line `key = ...` replaced."""
    lines = text.splitlines()
    where = [n for n, old in enumerate(lines) if old.split("=")[0].strip() == key]
    assert len(where) == 1, f"{key} must stand on exactly one line"
    lines[where[0]] = line
    return "\n".join(lines) + "\n"


def without(text: str, key: str) -> str:
    """The text without the line `key = ...`."""
    return with_line(text, key, "")
