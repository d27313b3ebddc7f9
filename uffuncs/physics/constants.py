"""Exact constants of the International System of Units (BIPM, The International System of Units, 9th ed., 2019)."""

BOLTZMANN_CONSTANT = 1.380649e-23  # J/K
AVOGADRO_CONSTANT = 6.02214076e23  # 1/mol
GAS_CONSTANT = BOLTZMANN_CONSTANT * AVOGADRO_CONSTANT  # J/(mol·K)
STANDARD_ATMOSPHERE = 101325.0  # Pa
