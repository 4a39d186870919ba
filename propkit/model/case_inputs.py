"""Inputs of the propellant cases: bounds, readers, and what several of them make together."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from propkit import units
from propkit.chain import case as stage
from propkit.errors import InputError, Problem
from propkit.model.declare import Bounds, NumberInput, as_text
from propkit.model.doubts import Doubt
from propkit.model.propellant import Propellant, as_propellant

TEMPERATURES = Bounds(at_least=1.0, at_most=3000.0)
PRESSURES = Bounds(at_least=100.0, at_most=1e9)
RATIOS = Bounds(at_least=1e-4, at_most=1e4)
PERCENTS = Bounds(above=0.0, below=100.0)
FRACTIONS = Bounds(at_least=0.0, at_most=1.0)
_SLOW = {"C": "soot and unburnt fuel", "N": "ammonia and nitrogen"}
"""What is slow to react in a fuel-rich gas, by element; common practice, no source."""
_ADDITIVES = 'what is added with its mass fraction of the whole flow, for example {"water": 0.05}'


class PercentInput(NumberInput):
    """A number of percent: 75 and "75 %" are the same."""

    def read(self, value: Any) -> Any:
        """Return the number of percent; InputError with one problem when it is not legal."""
        percent = units.to_si(value, "percent", self.name)
        allowed = self.bounds.problem(percent, "")
        if allowed:
            raise InputError(Problem(self.name, as_text(value), f"{allowed} percent"))
        return percent


def read_additives(name: str, value: Any) -> tuple[tuple[Propellant, float], ...]:
    """Return (propellant, mass fraction of the whole) pairs that together are less than the whole."""
    pairs = list(value.items()) if isinstance(value, Mapping) else value
    if not isinstance(pairs, list | tuple) or not all(isinstance(pair, list | tuple) and len(pair) == 2 for pair in pairs):
        raise InputError(Problem(name, as_text(value), _ADDITIVES))
    problems: list[Problem] = []
    read: list[tuple[Propellant, float]] = []
    for part, share in pairs:
        try:
            propellant = as_propellant(name, part)
            fraction = units.to_si(share, "", f"{name}[{propellant.label!r}]")
        except InputError as error:
            problems += error.problems
            continue
        if not 0.0 < fraction < 1.0:
            problems.append(Problem(f"{name}[{propellant.label!r}]", as_text(share), "above 0 and below 1"))
        read.append((propellant, fraction))
    total = sum(fraction for _, fraction in read)
    if not problems and total >= 1.0:
        problems.append(Problem(name, f"{total:g} of the whole", "less than the whole", "They are fractions of the whole flow."))
    if problems:
        raise InputError(problems)
    return tuple(read)


def amount_problems(typed: Mapping[str, Any], bad: set[str]) -> Iterator[Problem]:
    """Yield what is wrong with the ways of saying how much: exactly one of them is given."""
    given = [name for name in stage.AMOUNTS if name in typed]
    others = ", ".join(stage.AMOUNTS[1:])
    if len(given) > 1:
        values = f"{typed[given[0]]} beside {' and '.join(f'{name} {typed[name]}' for name in given[1:])}"
        yield Problem(
            given[0],
            values,
            f"given alone or left to {' or '.join(given[1:])}",
            "Give one of the two." if len(given) == 2 else "Give one of them.",
        )
    elif not given and not bad & set(stage.AMOUNTS):
        yield Problem("mixture_ratio", "missing", f"given, or one of {others} in its place", "For example mixture_ratio=3.4.")


def amount_results(found: Mapping[str, Any]) -> tuple[dict[str, float], dict[str, str]]:
    """Return the amounts that exist, and why the others do not."""
    results = {name: float(value) for name, value in found.items() if np.isfinite(value)}
    reasons = {
        "stoichiometric_mixture_ratio": "the valences of this pair do not balance at any mixture ratio",
        "equivalence_ratio": "the valences of this pair do not balance at any mixture ratio",
        "mixture_ratio_by_volume": "a density is not known",
    }
    return results, {name: reasons[name] for name in found if name not in results}


def mixture_results(mixture: stage.Mixture, results: dict[str, float], absent: dict[str, str], unknown_density: str) -> None:
    """Add enthalpy, bulk density and oxygen balance of a mixture to the results, or why they are absent."""
    results["enthalpy"] = float(mixture.enthalpy[0])
    if np.isfinite(mixture.density[0]):
        results["bulk_density"] = float(mixture.density[0])
    else:
        absent["bulk_density"] = unknown_density
    balance = float(stage.oxygen_balance(mixture)[0])
    if np.isfinite(balance):
        results["oxygen_balance"] = balance
    else:
        absent["oxygen_balance"] = "an element of the mixture has no valence here"


def fuel_rich_doubts(equivalence_ratio: float | None, mixture: stage.Mixture) -> Iterator[Doubt]:
    """Yield a doubt for a mixture as rich in fuel as that of a gas generator."""
    if equivalence_ratio is None or equivalence_ratio < stage.FUEL_RICH_LIMIT:
        return
    slow = [words for symbol, words in _SLOW.items() if symbol in mixture.symbols]
    why = f"{' and '.join(slow)} do not come to equilibrium in the time there is" if slow else "mixing is then seldom complete"
    yield Doubt(
        f"At {equivalence_ratio:.3g} times the stoichiometric fuel the real gas is far from equilibrium: {why}. A gas that was measured "
        f"goes in through pk.Chamber.from_gas(...).",
        code="fuel-rich",
        about="equivalence_ratio",
    )


def unknown_species(name: str, unknown: list[str]) -> InputError:
    """Return the error for a gas whose species the data do not have."""
    return InputError(Problem("gas", f"{name!r}, with {', '.join(unknown)}", "a gas whose species are in the species data"))


def no_core(typed: Mapping[str, Any], mixture_ratio: float) -> InputError:
    """Return the error for a film that takes more of a propellant than there is."""
    ratio = typed.get("film_mixture_ratio", 0.0)
    given = f"{typed['film_fraction']} at a mixture ratio of {ratio}"
    hint = f"The whole has a mixture ratio of {mixture_ratio:.4g}; the film would take more of one propellant than there is."
    return InputError(Problem("film_fraction", given, "a smaller part, or at another mixture ratio", hint))
