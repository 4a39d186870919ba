"""Constants: value, unit, source. The gas constant is Cantera's, the standard gravity the defined one."""

from __future__ import annotations

from typing import Final

GAS_CONSTANT: Final = 8.31446261815324
"""Molar gas constant [J/(mol K)]: the exact value of the 2019 SI, CODATA 2018; also Cantera's."""

STANDARD_GRAVITY: Final = 9.80665
"""Standard acceleration of free fall [m/s2]: CGPM 1901, the definition of Isp in seconds."""

REFERENCE_PRESSURE: Final = 100_000.0
"""Standard-state pressure of the thermodynamic data [Pa]: 1 bar."""

REFERENCE_TEMPERATURE: Final = 298.15
"""Reference temperature of formation enthalpies [K]."""

SEA_LEVEL_PRESSURE: Final = 101_325.0
"""Sea-level pressure of the US Standard Atmosphere 1976 [Pa]; one standard atmosphere."""
