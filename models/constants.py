"""Physical constants, each exact, derived or measured, with its source.

*exact* by definition, *derived* from exact ones here, *measured* with a published value.
"""

from __future__ import annotations

BOLTZMANN = 1.380649e-23  # J/K, exact: SI Brochure, 9th ed., 2019
AVOGADRO = 6.02214076e23  # 1/mol, exact: SI Brochure, 9th ed., 2019
GAS_CONSTANT = BOLTZMANN * AVOGADRO  # J/(mol K), derived: 8.314462618...
ZERO_CELSIUS = 273.15  # K, exact: SI Brochure, 9th ed., 2019, 2.3.1
STANDARD_ATMOSPHERE = 101_325.0  # Pa, exact: 10th CGPM, 1954, resolution 4
STANDARD_GRAVITY = 9.80665  # m/s2, exact: 3rd CGPM, 1901

# The standard atmosphere below 11 km, ISO 2533:1975, table 1 and eq. 12.
ATMOSPHERE_SEA_LEVEL_TEMPERATURE = 288.15  # K, exact by convention
ATMOSPHERE_LAPSE_RATE = 0.0065  # K/m, exact by convention
ATMOSPHERE_GAS_CONSTANT = 287.05287  # J/(kg K), exact by convention
ATMOSPHERE_EARTH_RADIUS = 6_356_766.0  # m, exact by convention: geopotential altitude

# Conventional weighing in air, OIML D 28:2004: what "weight in air" means.
CONVENTIONAL_AIR_DENSITY = 1.2  # kg/m3, exact by convention
CONVENTIONAL_WEIGHT_DENSITY = 8000.0  # kg/m3, exact by convention

# Water at 60 °F and one atmosphere, to which relative densities and degrees API refer.
WATER_DENSITY_60F = 999.016  # kg/m3, exact by convention: API MPMS 11.1-2004
