"""Written relations of separation, contour, losses and heat load: what lies between ideal and delivered."""

from __future__ import annotations

from propkit.physics import boundary_layer, contour, heat_transfer, losses, separation
from propkit.physics.relation import TERMS, Relation, Term, relation

DELIVERED: tuple[Relation, ...] = (
    # separation
    relation(
        "summerfield_ambient",
        TERMS["ambient_pressure"],
        "{exit_pressure} / 0.4",
        separation.summerfield_ambient,
        "summerfield-1954",
    ),
    relation(
        "kalt_badal_ambient",
        TERMS["ambient_pressure"],
        "(3 / 2 * {exit_pressure} * {stagnation_pressure} ** 0.2) ** (1 / 1.2)",
        separation.kalt_badal_ambient,
        "kalt-badal-1965",
    ),
    relation(
        "schmucker_ambient",
        TERMS["ambient_pressure"],
        "{exit_pressure} * (1.88 * {exit_mach} - 1) ** 0.64",
        separation.schmucker_ambient,
        "schmucker-1973",
    ),
    relation(
        "lip_shock_ambient",
        TERMS["ambient_pressure"],
        "{exit_pressure} * (2 * {isentropic_exponent} * {exit_mach} ** 2 - ({isentropic_exponent} - 1)) / ({isentropic_exponent} + 1)",
        separation.lip_shock_ambient,
        "naca1135",
    ),
    # contour and losses
    relation(
        "cone_length",
        Term("L", "m"),
        "{throat_radius} * (sqrt({area_ratio}) - 1 + {throat_arc} * (1 / cos({half_angle}) - 1)) / tan({half_angle})",
        contour.cone_length,
        "sutton-biblarz",
    ),
    relation("stay_time", Term(r"t_{s}", "s"), "{volume} * {density} / {mass_flow}", contour.stay_time, "sutton-biblarz"),
    relation(
        "cone_divergence_factor",
        TERMS["divergence_factor"],
        "(1 + cos({half_angle})) / 2",
        losses.cone_divergence_factor,
        "sutton-biblarz",
    ),
    relation(
        "bell_divergence_factor",
        TERMS["divergence_factor"],
        "(1 + cos(({throat_to_lip_angle} + {lip_angle}) / 2)) / 2",
        losses.bell_divergence_factor,
        "rao-1960",
    ),
    relation(
        "divergence_ratio",
        Term(r"\eta_{d}"),
        "({divergence_factor} * {momentum_thrust} + {pressure_thrust}) / ({momentum_thrust} + {pressure_thrust})",
        losses.divergence_ratio,
        "cpia-246",
    ),
    relation(
        "kinetics_ratio",
        Term(r"\eta_{k}"),
        "1 - {share} * (1 - {frozen} / {shifting})",
        losses.kinetics_ratio,
        "common-practice",
    ),
    relation(
        "boundary_layer_drag",
        TERMS["drag"],
        "2 * pi * {exit_radius} * {density} * {velocity} ** 2 * {momentum_thickness} * cos({lip_angle})",
        boundary_layer.boundary_layer_drag,
        "cpia-246",
    ),
    relation("boundary_layer_ratio", Term(r"\eta_{bl}"), "1 - {drag} / {thrust}", losses.boundary_layer_ratio, "cpia-246"),
    relation(
        "two_phase_ratio",
        Term(r"\eta_{tp}"),
        "1 - {momentum_share} * {condensed_mass_fraction} * {velocity_lag}",
        losses.two_phase_ratio,
        "conservation",
    ),
    # heat load
    relation(
        "adiabatic_wall_temperature",
        TERMS["adiabatic_wall_temperature"],
        "{static_temperature} + {prandtl} ** (1 / 3) * ({stagnation_temperature} - {static_temperature})",
        heat_transfer.adiabatic_wall_temperature,
        "bartz-1957",
    ),
    relation(
        "property_correction",
        TERMS["property_correction"],
        "({wall_temperature} / (2 * {stagnation_temperature}) * (1 + ({isentropic_exponent} - 1) / 2 * {mach} ** 2)"
        " + 1 / 2) ** (-0.68)"
        " * (1 + ({isentropic_exponent} - 1) / 2 * {mach} ** 2) ** (-0.12)",
        heat_transfer.property_correction,
        "bartz-1957",
    ),
    relation(
        "heat_transfer_coefficient",
        TERMS["coefficient"],
        "0.026 / {throat_diameter} ** 0.2 * ({viscosity} ** 0.2 * {specific_heat} / {prandtl} ** 0.6)"
        " * ({stagnation_pressure} / {characteristic_velocity}) ** 0.8"
        " * ({throat_diameter} / {throat_arc_radius}) ** 0.1"
        " * {area_ratio} ** (-0.9) * {property_correction}",
        heat_transfer.heat_transfer_coefficient,
        "bartz-1957",
    ),
    relation(
        "heat_flux",
        Term("q", "W/m**2"),
        "{coefficient} * ({adiabatic_wall_temperature} - {wall_temperature})",
        heat_transfer.heat_flux,
        "bartz-1957",
    ),
    relation(
        "coolant_temperature_rise",
        Term(r"\Delta T", "K"),
        "{heat_load} / ({coolant_mass_flow} * {coolant_specific_heat})",
        heat_transfer.coolant_temperature_rise,
        "conservation",
    ),
)
