"""Reports of invented objects with realistic numbers: what the renderings are tried on."""

from __future__ import annotations

import pytest

from propkit.report import Column, Report, Row, Section, Step, Table
from propkit.series import Axis, Bars, Figure, Line, Mark, Rule, Series

NASTY = "<script>alert(1)</script> $\\& {x}_^~#% | `code` **b** 'q' \"d\" <img src=x onerror=y>"
"""What a user might type, or paste, as a name."""

LONG = "Third hot-fire article of the demonstrator with the extended skirt, as built, after the second rework of the injector"

SEPARATION = "Separation is likely: the exit pressure is 0.278 of the ambient pressure."


def row(name: str, symbol: str, value: float | str | None, unit: str = "", digits: int = 5, **more: object) -> Row:
    """Return a row with its label made from the name; computed unless `kind` says otherwise."""
    kind = more.pop("kind", "computed")
    return Row(name, name.replace("_", " "), symbol, value, unit, digits, kind, **more)  # type: ignore[arg-type]


def stations() -> Section:
    """Return stations with quantities of very different size."""
    columns = (
        Column("pressure", "pressure", "p", "MPa", 5, (9.7, 9.12312, 5.44881, 0.028209)),
        Column("temperature", "temperature", "T", "K", 6, (3594.58, 3580.13, 3414.06, 1862.31)),
        Column("density", "density", r"\rho", "kg/m**3", 5, (7.0633, 6.6725, 4.2295, 0.042855)),
        Column("mach", "Mach number", "M", "", 5, (0.0, 0.23634, 1.0, 3.8371)),
        Column("enthalpy", "enthalpy", "h", "kJ/kg", 6, (-1577.55, -1620.78, -2304.87, -17360.82)),
        Column("phase", "phase", "", "", 5, ("gas", "gas", "gas", None)),
    )
    index = ("injector face", "nozzle inlet", "throat", "exit")
    return Section("stations", "Stations", table=Table("stations", "Stations", "station", index, columns))


def composition() -> Section:
    """Return a composition at two stations, with traces."""
    species = ("H2O", "CO", "C2H2 (acetylene)", "Al2O3 (liquid)")
    columns = (
        Column("throat", "throat", "x", "", 4, (0.5101, 0.172, 0.01887, 8.299e-5)),
        Column("exit", "exit", "x", "", 4, (0.5872, 0.1178, 0.0001997, 4.286e-10)),
    )
    table = Table("composition", "Composition", "species", species, columns, "Mole fractions of 0.0001 and above.")
    return Section("composition", "Composition", table=table)


def drawings() -> tuple[Figure, ...]:
    """Return one figure of each sort."""
    wall = ((-0.2, 0.14), (-0.05, 0.1), (0.0, 0.09), (0.4, 0.3))
    outline = [*wall, *((x, -r) for x, r in reversed(wall))]
    xs, ys = (tuple(point[axis] for point in outline) for axis in (0, 1))
    body = Line(Series("axial position", xs, "m", "x"), Series("radius", ys, "m", "r"), "ink", closed=True, fill=True)
    altitude = Series("altitude", (0.0, 10.0, 20.0, 30.0), "km")
    curve = Line(altitude, Series("thrust", (376.4, 440.0, float("nan"), 466.0), "kN", "F"), "accent", label="thrust")
    ideal = Line(altitude, Series("ideal", (380.0, 445.0, 462.0, 468.0), "kN", "F"), 2, "dashed", label="ideal <&>")
    shares = Bars(("H2O", "CO2"), Series("mole fraction", (49.3, 13.0), "percent", "x"), ("49.3 %", "13.0 %"))
    return (
        Figure("outline", "Nozzle <to scale>", "Nozzle outline & 'throat'", Axis("x", "m"), Axis("r", "m"),
               (body, Mark(0.0, 0.09, "throat 180 mm"), Mark(0.4, 0.3, "exit 0.6 m")), equal_aspect=True),
        Figure("altitude", "Thrust against altitude", "Thrust against altitude", Axis("altitude", "km", "z"),
               Axis("thrust", "kN", r"F_{vac}"), (curve, ideal, Rule("x", 3.0, "separated below"), Rule("y", 450.0, "needed"),
                                                 Mark(0.0, 376.4, "sea level"))),
        Figure("composition", "Composition of the gas", "Largest mole fractions", Axis("x", "percent"), Axis(""), (shares,)),
    )  # fmt: skip


def performance(title: str = "Demonstrator, sea-level trial") -> Report:
    """Return a sheet with everything on it: doubts, a missing value, uncertainties, drawings, tables, cautions."""
    return Report(
        kind="Performance",
        title=title,
        subtitle="LOX / LCH4 at mixture ratio 3.4",
        units="SI",
        headline=(
            row("thrust", "F", 376.361, "kN", uncertainty=4.27, doubts=(SEPARATION,)),
            row("specific_impulse", "I_{sp}", 286.78, "s", doubts=(SEPARATION,)),
        ),
        given=(
            row("ambient", "p_{a}", "sea level", kind="given"),
            row("throat_diameter", "d_{t}", 180.0, "mm", kind="given", typed="0.18 m"),
            row("chamber_pressure", "p_{c}", 9.70002, "MPa", kind="given", typed="1406.87 psia"),
            row("name_of_stand", "", title, kind="given"),
            row("discharge_coefficient", "C_{d}", 1.0, "", 4, kind="default"),
        ),
        results=(
            row("thrust", "F", 376.361, "kN"),
            row("exit_area", "A_{e}", 890642.1, "mm**2", 6, source="conservation"),
            row("effective_exhaust_velocity", r"\dot{m}_{ox}", 2812.32, "m/s", 6),
            row("oxygen_balance", r"\Omega", -0.74, "", 4),
            row("leak_rate", "q", 2.903e-5, "kg/s", 4, doubts=("Below the range of the correlation.",)),
            row("frozen_exponent", r"\gamma_{f}", None, "", 5, doubts=("Not known for this gas.",)),
            row("characteristic_velocity", r"c^{*}", 5872.6, "foot/s", 6),
            row("tank_temperature", "T", 162.3, "degR", 5),
            row("tank_pressure", "p", 44.1, "psi", 4),
            row("weight", "W", 84610.0, "lbf", 6),
        ),
        sections=(
            stations(),
            composition(),
            Section("assumptions", "Assumptions", lines=("One-dimensional flow.", f"Named {title}.")),
            Section("checks", "Checks", rows=(row("residual", "", 2.1e-08, "", 2),)),
        ),
        doubts=("The mixture ratio is outside the range of the data: 3.4 < 3.6.",),
        figures=drawings(),
        cautions=("LOX: cryogenic; strong oxidizer",),
    )


def working() -> Report:
    """Return a working: one relation with numbers, one condition of an iterated state."""
    answer = row("thrust", "F", 376.361, "kN")
    return Report(
        kind="Working",
        title="thrust",
        subtitle="",
        units="SI",
        headline=(answer,),
        steps=(
            Step("thrust", "thrust", "thrust = mass_flow * exit_velocity", r"F = \dot{m} u_{e}",
                 "thrust = 133.824 * 2812.3", answer, "summerfield-1954", numbers_latex=r"F = 133.824 \cdot 2812.3"),
            Step("energy", "energy at the exit [J/kg]", "h + u^2/2 = stagnation enthalpy", r"h + \frac{u^{2}}{2} = h_{0}", "",
                 left=-1577549.832, right=-1577549.831, residual=6.3e-10),
        ),
    )  # fmt: skip


@pytest.fixture(scope="session")
def nasty() -> str:
    return NASTY


@pytest.fixture(scope="session")
def reports() -> dict[str, Report]:
    """All samples by name."""
    bare = Report("Propellant", "RP-1 lot 7", "", "US")
    return {
        "performance": performance(),
        "long": performance(LONG),
        "nasty": performance(NASTY),
        "working": working(),
        "bare": bare,
    }
