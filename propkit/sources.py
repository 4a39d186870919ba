"""The bibliography: key -> full reference. Relations, quantities and data rows name their source by key."""

from __future__ import annotations

SOURCES: dict[str, str] = {
    "definition": "Definition of the quantity.",
    "si-brochure": "BIPM, The International System of Units (SI Brochure), 9th edition, 2019.",
    "codata-2018": "E. Tiesinga et al., CODATA recommended values of the fundamental physical constants: 2018, Rev. Mod. Phys. 93 (2021) 025010.",
    "tm4513": "B. J. McBride, S. Gordon, M. A. Reno, Coefficients for Calculating Thermodynamic and Transport Properties of Individual "
    "Species, NASA TM-4513, 1993 (species data as shipped with Cantera).",
    "atct": "B. Ruscic et al., Active Thermochemical Tables; OH: B. Ruscic et al., J. Phys. Chem. A 106 (2002) 2727-2747.",
    "rn1037": "V. N. Huff, S. Gordon, V. E. Morrell, General Method and Thermodynamic Tables for Computation of Equilibrium "
    "Composition and Temperature of Chemical Reactions, NACA Report 1037, 1951.",
    "white-1958": "W. B. White, S. M. Johnson, G. B. Dantzig, Chemical Equilibrium in Complex Mixtures, J. Chem. Phys. 28 (1958) 751-755.",
    "smith-missen-1982": "W. R. Smith, R. W. Missen, Chemical Reaction Equilibrium Analysis, Wiley, 1982.",
    "naca1135": "Ames Research Staff, Equations, Tables, and Charts for Compressible Flow, NACA Report 1135, 1953.",
    "us-standard-atmosphere-1976": "U.S. Standard Atmosphere, 1976, NOAA/NASA/USAF, Washington, 1976.",
    "sutton-biblarz": "G. P. Sutton, O. Biblarz, Rocket Propulsion Elements, Wiley.",
    "cpia-246": "J. L. Pieper, ICRPG/JANNAF Liquid Propellant Thrust Chamber Performance Evaluation Manual, CPIA Publication 246.",
    "rao-1960": "G. V. R. Rao, Approximation of Optimum Thrust Nozzle Contour, ARS Journal 30 (1960) 561.",
    "bartz-1957": "D. R. Bartz, A Simple Equation for Rapid Estimation of Rocket Nozzle Convective Heat Transfer Coefficients, Jet Propulsion 27 (1957) 49-51.",
    "summerfield-1954": "M. Summerfield, C. R. Foster, W. C. Swan, Flow Separation in Overexpanded Supersonic Exhaust Nozzles, Jet Propulsion 24 (1954) 319-321.",
    "kalt-badal-1965": "S. Kalt, D. Badal, Conical Rocket Nozzle Performance under Flow-Separated Conditions, J. Spacecraft and Rockets 2 (1965) 447-449.",
    "schmucker-1973": "R. H. Schmucker, Flow Processes in Overexpanded Chemical Rocket Nozzles, 1973.",
    "gum": "JCGM 100:2008, Evaluation of measurement data: Guide to the expression of uncertainty in measurement.",
    "gum-s1": "JCGM 101:2008, Supplement 1 to the GUM: Propagation of distributions using a Monte Carlo method.",
    "vdi2048": "VDI 2048, Control and quality improvement of process data and their uncertainties by means of correction calculation.",
    "conservation": "Conservation of mass, momentum and energy.",
    "common-practice": "Common practice, no source.",
}


def reference(key: str) -> str:
    """Return the full reference of `key`, or `key` itself when it is already a reference in words."""
    return SOURCES.get(key, key)
