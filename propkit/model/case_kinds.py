"""The other kinds of propellant case, made through `PropellantCase`: one propellant, a cold gas, a coolant film."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from propkit.bridge import basis as bases

if TYPE_CHECKING:
    from propkit.model.cold_gas_case import ColdGasCase
    from propkit.model.declare import NumberLike, QuantityLike
    from propkit.model.film_case import FilmCase
    from propkit.model.monopropellant_case import MonopropellantCase


class CaseKinds:
    """Makers of the other kinds of case."""

    @staticmethod
    def monopropellant(
        propellant: Any,
        *,
        propellant_temperature: QuantityLike | None = None,
        propellant_pressure: QuantityLike | None = None,
        ammonia_dissociation: NumberLike | None = None,
        condensed: bool = False,
        thermo_basis: str = bases.BASES[0],
        name: str = "",
    ) -> MonopropellantCase:
        """Return a case of one propellant, or of a mixture that burns as one (a composite).

        Parameters
        ----------
        propellant : str, Propellant or mapping
            A library name, a propellant, a blend, or ingredients with their mass fractions.
        propellant_temperature, propellant_pressure : quantity, optional
            State as stored or fed [K], [Pa]; that of its data by default.
        ammonia_dissociation : float, optional
            Hydrazine only: part of the ammonia that dissociates [1], 0 to 1. The composition is then fixed. Full equilibrium without it.
        condensed, thermo_basis, name
            As for `PropellantCase`.
        """
        from propkit.model.monopropellant_case import MonopropellantCase

        optional: dict[str, Any] = {
            "propellant_temperature": propellant_temperature,
            "propellant_pressure": propellant_pressure,
            "ammonia_dissociation": ammonia_dissociation,
            "condensed": condensed or None,
            "thermo_basis": None if thermo_basis == bases.BASES[0] else thermo_basis,
            "name": name or None,
        }
        return MonopropellantCase(propellant, **{key: value for key, value in optional.items() if value is not None})

    @staticmethod
    def cold_gas(
        gas: Any,
        *,
        temperature: QuantityLike | None = None,
        tank_pressure: QuantityLike | None = None,
        thermo_basis: str = bases.BASES[0],
        name: str = "",
    ) -> ColdGasCase:
        """Return a case of a gas that expands as it is, without combustion.

        Parameters
        ----------
        gas : str or Propellant
            A library name such as ``"GN2"``, or a gas of one's own.
        temperature : quantity, optional
            Temperature as stored [K]; that of its data by default.
        tank_pressure : quantity, optional
            Pressure in the tank [Pa]; only the bulk density and the density impulse rest on it.
        thermo_basis, name
            As for `PropellantCase`.
        """
        from propkit.model.cold_gas_case import ColdGasCase

        optional: dict[str, Any] = {
            "temperature": temperature,
            "tank_pressure": tank_pressure,
            "thermo_basis": None if thermo_basis == bases.BASES[0] else thermo_basis,
            "name": name or None,
        }
        return ColdGasCase(gas, **{key: value for key, value in optional.items() if value is not None})

    @staticmethod
    def with_film(
        oxidizer: Any,
        fuel: Any,
        *,
        film_fraction: NumberLike,
        film_mixture_ratio: NumberLike = 0.0,
        mixture_ratio: NumberLike | None = None,
        equivalence_ratio: NumberLike | None = None,
        mixture_ratio_by_volume: NumberLike | None = None,
        oxidizer_percent: NumberLike | None = None,
        oxidizer_temperature: QuantityLike | None = None,
        fuel_temperature: QuantityLike | None = None,
        oxidizer_pressure: QuantityLike | None = None,
        fuel_pressure: QuantityLike | None = None,
        additives: Any = None,
        condensed: bool = False,
        thermo_basis: str = bases.BASES[0],
        name: str = "",
    ) -> FilmCase:
        """Return a case whose coolant film flows beside the core without mixing.

        Parameters
        ----------
        oxidizer, fuel : str, Propellant or mapping
            The propellants.
        film_fraction : float
            Mass flow of the film over the whole mass flow [1].
        film_mixture_ratio : float
            Oxidizer over fuel mass flow in the film [1]; 0, fuel alone, by default.
        mixture_ratio, equivalence_ratio, mixture_ratio_by_volume, oxidizer_percent : float or text
            One of the four, for the whole flow, film included; the ratio of the core follows.
        oxidizer_temperature, fuel_temperature, oxidizer_pressure, fuel_pressure, additives, condensed, thermo_basis, name
            As for `PropellantCase`.
        """
        from propkit.model.film_case import FilmCase

        optional: dict[str, Any] = {
            "film_mixture_ratio": None if film_mixture_ratio == 0.0 else film_mixture_ratio,
            "mixture_ratio": mixture_ratio,
            "equivalence_ratio": equivalence_ratio,
            "mixture_ratio_by_volume": mixture_ratio_by_volume,
            "oxidizer_percent": oxidizer_percent,
            "oxidizer_temperature": oxidizer_temperature,
            "fuel_temperature": fuel_temperature,
            "oxidizer_pressure": oxidizer_pressure,
            "fuel_pressure": fuel_pressure,
            "additives": additives,
            "condensed": condensed or None,
            "thermo_basis": None if thermo_basis == bases.BASES[0] else thermo_basis,
            "name": name or None,
        }
        given = {key: value for key, value in optional.items() if value is not None}
        return FilmCase(oxidizer, fuel, film_fraction=film_fraction, **given)
