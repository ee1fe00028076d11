"""The files `localcomp new` writes: commented, and they run as they are."""

from __future__ import annotations

STATE_TOML = """\
# A mixture of spheres with square wells, in one state. Run it with:  localcomp state state.toml
# Reduced units: lengths in one diameter, energies in one well depth of your choice.

[mixture]
names = ["small", "large"]
diameter = [1.0, 1.5]          # sigma of each species
well_depth = [1.0, 1.5]        # eps of each species; 0 is a hard sphere, negative a shoulder
well_range = 1.5               # the well ends at 1.5 sigma; a number, or one per species
k = 0.1                        # eps_12 = (1 - k) sqrt(eps_1 eps_2); a number or a full matrix
# l = 0.0                      # sigma_12 = (1 - l) (sigma_1 + sigma_2)/2

# A pair may be given outright, whatever the rules above say:
# [[mixture.pairs]]
# between = ["small", "large"]
# diameter = 1.25
# well_depth = 1.1
# well_range = 1.5

[state]
temperature = 2.0              # kT in the energy unit
packing_fraction = 0.40        # eta = (pi/6) sum rho_i sigma_i^3; a liquid has 0.35 to 0.45
mole_fractions = [0.5, 0.5]    # they sum to 1; 0 is infinite dilution
closure = "rhnc"               # rhnc (best against simulation), hnc, py, msa

[shell]
rule = "well_edge"             # well_edge, first_minimum, or multiple (then also: multiple = 1.5)

[numerics]
accuracy = 1e-5                # relative, on neighbour counts; the program picks its grid

# For kelvin, angstrom and J/mol, uncomment this, give eps/k in kelvin, sigma in angstrom, the
# temperature in kelvin, and if you like molar_volume (cm3/mol) in place of packing_fraction:
# [units]
# length = "angstrom"
# energy = "kelvin"
"""

LIQUID_TOML = """\
# A measured pure liquid, to be turned into a sphere with a square well:  localcomp calibrate liquid.toml

[fluid]
name = "argon"
temperature = 87.3             # K
molar_volume = 28.628          # cm3/mol
residual_energy = -5786.0      # U - U(ideal gas), J/mol; or instead:  heat_of_vaporization = 6437.0
pressure = 101.302             # kPa
well_range = 1.5               # chosen; the other two parameters follow from it
closure = "rhnc"
source = "saturated liquid, reference equation of state of Tegeler, Span and Wagner (1999)"
"""

STUDY_TOML = """\
# A class of binary mixtures: every combination of the lists below is one state to solve.
#   localcomp check study.toml                how many states, how long, mistakes in this file
#   localcomp sweep study.toml --out results  solve them; interrupted runs resume
#   localcomp table results                   CSV and a summary
#   localcomp audit study.toml --out results  which model's statements hold, and where they break
# A list may be a range: { from = 1.0, to = 2.0, steps = 5 }.

[study]
name = "size and energy asymmetry"

[class]                                  # species 1 has sigma = eps = 1; these describe species 2
size_ratio = [1.0, 1.25, 1.5]            # sigma_2/sigma_1
energy_ratio = [1.0, 1.5, 2.0]           # eps_2/eps_1
k = [0.0, 0.1]                           # eps_12 = (1 - k) sqrt(eps_1 eps_2)
well_range = 1.5

# Instead of [class]: one [pair] (names, diameter, well_depth, ... as in a state file; k may be a
# list), or any number of [[mixtures]] with two or more species and mole_fractions below
# (each row goes with the mixtures of as many species).

[conditions]
temperature = { from = 1.5, to = 3.0, steps = 4 }
temperature_reference = "mean"           # T* = kT over: mean (of eps_1, eps_2), first, second, absolute
packing_fraction = [0.35, 0.40]
composition = [0.0, 0.1, 0.3, 0.5, 0.7, 0.9, 1.0]   # x_1; 0 and 1 are infinite dilution
# mole_fractions = [[0.2, 0.3, 0.5]]     # for more than two species
closures = ["rhnc"]                      # rhnc, hnc, py, msa

[shell]
rule = "well_edge"

[numerics]
accuracy = 1e-5

# How `localcomp audit study.toml --out results` judges models; all of it may be left out.
# [audit]
# models = ["wilson", "nrtl", "uniquac", "lsg", "quasi-chemical", "random"]   # or "all"
# z = 10                                 # lattice coordination number; or "measured"
# [audit.tolerances]                     # largest difference that still holds; set them before you look
# composition = 0.05                     # in ln R; also: boltzmann, athermal, density, ternary, shell_rule
# product = 0.10                         # in ln(R_12 R_21)
# reciprocity = 0.05                     # in ln(x_1 N_12 / x_2 N_21)
# coordination = 0.10                    # in ln N_i
# energy = 0.01                          # of the mean well depth
"""
