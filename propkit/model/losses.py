"""Losses of a performance: how they are asked for, how they become ratios, and the ledger from ideal to delivered."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from propkit import units
from propkit.chain import losses as stage
from propkit.chain import performance as delivery
from propkit.constants import STANDARD_GRAVITY
from propkit.errors import InputError, Problem, PropkitError, near_matches
from propkit.model.conditions import condition
from propkit.model.declare import as_text
from propkit.physics import losses as physics
from propkit.report import Step

if TYPE_CHECKING:
    import pandas as pd

    from propkit.model.nozzle import Nozzle
    from propkit.model.performance import Performance

GIVEN = tuple(name for name in physics.ORDER if name != "divergence")
"""Losses that a performance may be given; divergence comes from the contour of the nozzle."""

_OPTIONS = {
    "energy release": ("ratio", "decrement", "source"),
    "kinetics": ("ratio", "decrement", "share", "source"),
    "boundary layer": ("ratio", "decrement", "wall_temperature", "source"),
    "two-phase": ("ratio", "decrement", "velocity_lag", "source"),
}
_ESTIMATES = {"kinetics": "share", "boundary layer": "wall_temperature", "two-phase": "velocity_lag"}
_SOURCES = {"kinetics": "common-practice", "boundary layer": "cpia-246", "two-phase": "conservation", "divergence": "sutton-biblarz"}
_ALLOWED = 'an Isp ratio such as 0.985 or "98.5 %", a decrement such as "3 s", "estimate", or a dict with ratio or decrement and source'


@dataclass(frozen=True, slots=True)
class Request:
    """One loss as asked for: a ratio, a decrement [s], or an estimate with its parameter in SI (None: the default)."""

    name: str
    ratio: float | None = None
    decrement: float | None = None
    parameter: float | None = None
    source: str = ""

    @property
    def estimated(self) -> bool:
        """Whether propkit estimates the number."""
        return self.ratio is None and self.decrement is None


class Requests(tuple[Request, ...]):
    """The losses asked for, in their order; as text a short list."""

    __slots__ = ()

    @property
    def text(self) -> str:
        """What was asked for in words."""
        return ", ".join(f"{entry.name} {_words(entry)}" for entry in self) or "none"


def _words(entry: Request) -> str:
    if entry.ratio is not None:
        return f"{entry.ratio:.6g}"
    return f"{entry.decrement:g} s" if entry.decrement is not None else "(estimate)"


def read_losses(name: str, value: Any) -> Requests:
    """Return the losses that `value` asks for.

    Raises
    ------
    InputError
        Listing every loss that is unknown or has no legal value.
    """
    if isinstance(value, Requests):
        return value
    if not isinstance(value, Mapping):
        raise InputError(Problem(name, as_text(value), 'a dict such as {"kinetics": 0.99, "boundary layer": "estimate"}'))
    found: dict[str, Request] = {}
    problems: list[Problem] = []
    for key, given in value.items():
        word = str(key).replace("_", " ").replace("two phase", "two-phase")
        if word == "divergence":
            hint = 'Give the nozzle a contour, for instance contour=pk.Cone("15 deg"): it brings the divergence.'
            problems.append(Problem(f"{name}: divergence", as_text(given), "left to the contour of the nozzle", hint))
        elif word not in GIVEN:
            near = near_matches(word, GIVEN, 1)
            problems.append(Problem(name, repr(key), "one of " + ", ".join(map(repr, GIVEN)), f"Did you mean {near[0]!r}?" if near else ""))
        else:
            try:
                found[word] = _read(word, f"{name}: {word}", given)
            except InputError as error:
                problems.extend(error.problems)
    if problems:
        raise InputError(problems)
    return Requests(found[word] for word in GIVEN if word in found)


def _read(word: str, label: str, given: Any) -> Request:
    if isinstance(given, Mapping):
        return _read_parts(word, label, given)
    if given == "estimate":
        if word not in _ESTIMATES:
            raise InputError(
                Problem(label, "'estimate'", "given as a number", "There is no estimate of it here: it is measured, or common experience.")
            )
        if word == "two-phase":
            raise InputError(
                Problem(
                    label, "'estimate'", 'given with a lag, as in {"velocity_lag": 0.05}', "The lag of the particles is not computed here."
                )
            )
        return Request(word, source=_SOURCES[word])
    ratio, decrement = _ratio_or_decrement(label, given)
    return Request(word, ratio, decrement, source="given")


def _read_parts(word: str, label: str, given: Mapping[str, Any]) -> Request:
    unknown = [key for key in given if key not in _OPTIONS[word]]
    if unknown:
        raise InputError(Problem(label, repr(unknown[0]), "one of " + ", ".join(map(repr, _OPTIONS[word]))))
    ways = [key for key in given if key != "source"]
    if len(ways) != 1:
        raise InputError(
            Problem(label, as_text(dict(given)), "one of " + ", ".join(map(repr, _OPTIONS[word][:-1])) + ", with or without a source")
        )
    source = str(given.get("source", ""))
    if not source.isprintable() or len(source) > 200:
        raise InputError(Problem(f"{label}, source", as_text(source), "a printable text of at most 200 characters"))
    way, value = ways[0], given[ways[0]]
    if way in ("ratio", "decrement"):
        ratio, decrement = _ratio_or_decrement(label, value)
        if (ratio is None) == (way == "ratio"):
            raise InputError(Problem(f"{label}, {way}", as_text(value), "a pure number" if way == "ratio" else 'a time such as "3 s"'))
        return Request(word, ratio, decrement, source=source or "given")
    unit, low, high = ("K", 50.0, 6000.0) if way == "wall_temperature" else ("", 0.0, 1.0)
    parameter = units.to_si(value, unit, f"{label}, {way}")
    if not low <= parameter <= high:
        raise InputError(Problem(f"{label}, {way}", as_text(value), f"{low:g} to {high:g} {unit}".rstrip()))
    return Request(word, parameter=parameter, source=source or _SOURCES[word])


def _ratio_or_decrement(label: str, given: Any) -> tuple[float | None, float | None]:
    try:
        ratio = units.to_si(given, "", label)
    except InputError:
        try:
            decrement = units.to_si(given, "s", label)
        except InputError as error:
            raise InputError(Problem(label, as_text(given), _ALLOWED)) from error
        if not 0.0 <= decrement < 1000.0:
            raise InputError(Problem(label, as_text(given), "a decrement of 0 s or more and below 1000 s")) from None
        return None, decrement
    if not 0.0 < ratio <= 1.0:
        raise InputError(Problem(label, as_text(given), "above 0 and at most 1", "It is the Isp ratio: 0.98 is a loss of 2 %."))
    return ratio, None


# -- from requests to ratios ----------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Resolved:
    """Losses of a performance by name: ratios for the delivery stage, sources, how estimates came about, and their relations."""

    ratios: dict[str, float] = field(default_factory=dict)
    sources: dict[str, str] = field(default_factory=dict)
    estimates: dict[str, str] = field(default_factory=dict)
    relations: dict[str, tuple[str, dict[str, float]]] = field(default_factory=dict)


NOTHING = Resolved()


def resolve(requests: Requests, nozzle: Nozzle, ambient: float) -> Resolved:
    """Return every loss as a ratio at its place in the order, at an ambient pressure [Pa].

    Raises
    ------
    InputError
        For a loss that is given twice, or an estimate that this nozzle does not allow.
    """
    if not requests:
        return NOTHING
    if requests[0].name == "energy release" and nozzle.chamber.si("cstar_efficiency") != 1.0:
        hint = "Give the incomplete combustion once: there, or among the losses."
        raise InputError(Problem("losses: energy release", _words(requests[0]), "left out beside the chamber's cstar_efficiency", hint))
    made = Resolved()
    for entry in requests:
        before = _impulse_before(entry.name, nozzle, ambient, made.ratios)
        if entry.ratio is not None:
            ratio = entry.ratio
        elif entry.decrement is not None:
            if entry.decrement >= before:
                raise InputError(
                    Problem(f"losses: {entry.name}", f"{entry.decrement:g} s", f"below the specific impulse that is left, {before:.4g} s")
                )
            ratio = float(physics.ratio_of_decrement(entry.decrement, before))
        else:
            ratio, made.estimates[entry.name], made.relations[entry.name] = _estimate(entry, nozzle, ambient, before)
        made.ratios[entry.name] = ratio
        made.sources[entry.name] = entry.source
    return made


def _terms(nozzle: Nozzle, ambient: float) -> dict[str, float]:
    """Return what the delivery stage needs to know of a nozzle, for one case."""
    return {
        "mass_flow": nozzle.si("mass_flow"),
        "exit_velocity": nozzle.exit.si("velocity"),
        "exit_pressure": nozzle.exit.si("pressure"),
        "exit_area": nozzle.si("exit_area"),
        "ambient": ambient,
        "cstar_efficiency": nozzle.chamber.si("cstar_efficiency"),
        "divergence_factor": nozzle.si("divergence_factor") if nozzle.has("divergence_factor") else 1.0,
    }


def _impulse_before(name: str, nozzle: Nozzle, ambient: float, ratios: Mapping[str, float]) -> float:
    ideal, found = delivery.ledger(**_terms(nozzle, ambient), losses=ratios)
    place = physics.ORDER.index(name)
    for other, ratio in found.items():
        if physics.ORDER.index(other) < place:
            ideal *= ratio
    return ideal


def _estimate(entry: Request, nozzle: Nozzle, ambient: float, before: float) -> tuple[float, str, tuple[str, dict[str, float]]]:
    """Return the estimated ratio, how it came about in words, and its relation with the numbers put in."""
    label = f"losses: {entry.name}"
    if entry.name == "kinetics":
        if nozzle.flow != "shifting":
            raise InputError(
                Problem(
                    label,
                    "'estimate'",
                    "given as a number with this flow",
                    "The estimate lies between shifting and frozen flow and starts from shifting.",
                )
            )
        share = physics.KINETICS_SHARE if entry.parameter is None else entry.parameter
        shifting, frozen = stage.shifting_and_frozen(
            nozzle.chamber.held, nozzle.si("area_ratio") / nozzle.si("discharge_coefficient"), ambient
        )
        terms = {"shifting": shifting, "frozen": min(frozen, shifting), "share": share}
        ratio = float(physics.kinetics_ratio(**terms))
        return ratio, f"{share:.3g} of the way from shifting ({shifting:.5g} s) to frozen ({frozen:.5g} s)", ("kinetics_ratio", terms)
    if entry.name == "boundary layer":
        from propkit.model import friction

        if not nozzle.has("contour"):
            raise InputError(
                Problem(
                    label,
                    "'estimate'",
                    "given as a number without a contour",
                    "The integral method runs along a wall: give the nozzle a contour.",
                )
            )
        drag, words = friction.drag(nozzle, entry.parameter)
        force = before * nozzle.si("mass_flow") * STANDARD_GRAVITY
        return float(physics.boundary_layer_ratio(drag, force)), words, ("boundary_layer_ratio", {"drag": drag, "thrust": force})
    if "condensed_mass_fraction" not in nozzle.exit.names():
        raise InputError(Problem(label, "a velocity lag", "left out for a gas without liquids and solids", "Nothing lags behind it."))
    fraction = nozzle.exit.si("condensed_mass_fraction")
    terms = _terms(nozzle, ambient)
    momentum = terms["mass_flow"] * terms["cstar_efficiency"] * terms["exit_velocity"]
    share = momentum / (momentum + (terms["exit_pressure"] - ambient) * terms["exit_area"])
    lag = float(entry.parameter or 0.0)
    numbers = {"condensed_mass_fraction": fraction, "velocity_lag": lag, "momentum_share": share}
    words = f"{fraction:.3g} of the mass lags by {100.0 * lag:.3g} % of the velocity"
    return float(physics.two_phase_ratio(**numbers)), words, ("two_phase_ratio", numbers)


# -- the ledger -----------------------------------------------------------------------------------


def entries(performance: Performance) -> tuple[float, tuple[physics.Entry, ...]]:
    """Return the ideal specific impulse [s] and the losses of a performance in their order.

    Raises
    ------
    InputError
        For a nozzle that delivers no thrust.
    """
    nozzle = performance.nozzle
    resolved: Resolved = performance.resolved_losses
    ideal, ratios = delivery.ledger(**_terms(nozzle, performance.si("ambient")), losses=resolved.ratios)
    listed = [
        physics.Loss(name, ratio, source=_source(performance, name), estimate=name in resolved.estimates) for name, ratio in ratios.items()
    ]
    return ideal, physics.ledger(ideal, listed)


def _source(performance: Performance, name: str) -> str:
    resolved = performance.resolved_losses
    if name == "divergence":
        contour = performance.nozzle._values["contour"]
        return "rao-1960" if contour.divergence_relation.startswith("bell") else "sutton-biblarz"
    return resolved.sources.get(name, "given")


def frame(performance: Performance) -> pd.DataFrame:
    """Return the ledger: index loss; ratio, Isp lost, before and after [s], thrust lost [N], source, estimate, how."""
    import pandas as pd

    columns: dict[str, list[Any]] = {name: [] for name in ("ratio", "lost", "before", "after", "thrust_lost", "source", "estimate", "how")}
    names = []
    for entry, lost in thrust_lost(performance):
        names.append(entry.name)
        how = performance.resolved_losses.estimates.get(entry.name, "")
        row = (entry.ratio, entry.decrement, entry.before, entry.after, lost, entry.source, entry.estimate, how)
        for column, value in zip(columns, row, strict=True):
            columns[column].append(value)
    made = pd.DataFrame(columns, index=pd.Index(names, name="loss"))
    made.attrs["units"] = {"ratio": "", "lost": "s", "before": "s", "after": "s", "thrust_lost": "N"}
    return made


def thrust_lost(performance: Performance) -> Iterator[tuple[physics.Entry, float]]:
    """Yield each loss with the thrust that it costs [N]: none for the energy release, which raises the mass flow."""
    flow = performance.si("mass_flow") * STANDARD_GRAVITY
    for entry in entries(performance)[1]:
        release = entry.name == "energy release"
        yield entry, 0.0 if release else flow * entry.decrement


def working(performance: Performance) -> Iterator[tuple[str, str, dict[str, float]]]:
    """Yield (name, relation, numbers) of the losses that a relation gives: estimates, and the divergence of the contour."""
    yield from ((f"{name.replace(' ', '_')}_ratio", *made) for name, made in performance.resolved_losses.relations.items())
    terms = _terms(performance.nozzle, performance.si("ambient"))
    if terms["divergence_factor"] != 1.0:
        push = (terms["exit_pressure"] - terms["ambient"]) * terms["exit_area"]
        momentum = terms["mass_flow"] * terms["cstar_efficiency"] * terms["exit_velocity"]
        momentum = performance.resolved_losses.ratios.get("kinetics", 1.0) * (momentum + push) - push
        numbers = {"divergence_factor": terms["divergence_factor"], "momentum_thrust": momentum, "pressure_thrust": push}
        yield "divergence_ratio", "divergence_ratio", numbers


def conditions(performance: Performance) -> Iterator[Step]:
    """Yield the ledger as a condition: the ideal specific impulse times every ratio is the delivered one."""
    if not worth_showing(performance):
        return
    ideal, listed = entries(performance)
    words = " * ".join(f"{entry.ratio:.8g} ({entry.name})" for entry in listed)
    made = ideal
    for entry in listed:
        made *= entry.ratio
    text = f"ideal specific impulse * {words} = delivered"
    latex = r"I_{sp,id} \prod \eta_i = I_{sp}"
    yield condition("ledger", "ledger of the specific impulse [s]", text, latex, made, performance.si("specific_impulse"), "cpia-246")


def worth_showing(performance: Performance) -> bool:
    """Whether there is any loss to show, and a thrust to take it from."""
    try:
        return bool(entries(performance)[1])
    except PropkitError:
        return False
