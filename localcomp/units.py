"""Units: reduced by default; angstrom and kelvin on request, then results in J/mol and cm3/mol."""

from __future__ import annotations

from dataclasses import dataclass

GAS_CONSTANT = 8.31446261815324
"""J/(mol K), exact in the SI of 2019 (CODATA 2018)."""
AVOGADRO_A3_PER_CM3 = 0.602214076
"""N_A times 1e-24: turns 1/V with V in cm3/mol into molecules per cubic angstrom."""
LENGTH_UNITS = ("reduced", "angstrom")
ENERGY_UNITS = ("reduced", "kelvin")


@dataclass(frozen=True)
class Units:
    """The units of a file.

    Attributes
    ----------
    length : {"reduced", "angstrom"}
    energy : {"reduced", "kelvin"}
        "kelvin" means eps/k in kelvin and temperatures in kelvin.
    """

    length: str = "reduced"
    energy: str = "reduced"

    @property
    def real(self) -> bool:
        """Whether energies are reported in J/mol."""
        return self.energy == "kelvin"

    @property
    def energy_label(self) -> str:
        """Unit of a reported energy."""
        return "J/mol" if self.real else "energy unit"

    @property
    def temperature_label(self) -> str:
        """Unit of a temperature."""
        return "K" if self.real else "kT/energy unit"

    @property
    def length_label(self) -> str:
        """Unit of a length."""
        return "angstrom" if self.length == "angstrom" else "length unit"

    def energy_out(self, per_molecule: float) -> float:
        """An energy per molecule in the file's unit, as reported: J/mol or unchanged."""
        return per_molecule * GAS_CONSTANT if self.real else per_molecule


def density_from_molar_volume(molar_volume: float) -> float:
    """Number density in 1/angstrom^3 from a molar volume in cm3/mol."""
    return AVOGADRO_A3_PER_CM3 / molar_volume


def molar_volume_from_density(density: float) -> float:
    """Molar volume in cm3/mol from a number density in 1/angstrom^3."""
    return AVOGADRO_A3_PER_CM3 / density
