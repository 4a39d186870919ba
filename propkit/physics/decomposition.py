"""Decomposition of monopropellants to a composition that a catalyst bed fixes, not equilibrium."""

from __future__ import annotations

from propkit.errors import InputError, Problem


def hydrazine_products(ammonia_dissociation: float) -> dict[str, float]:
    """Return the products of decomposed hydrazine.

    Parameters
    ----------
    ammonia_dissociation : float
        Fraction x of the ammonia formed first that dissociates in the bed [1], 0 to 1.

    Returns
    -------
    dict
        Species key -> moles per mole of hydrazine [1]; species with no moles are left out.

    Raises
    ------
    InputError
        When the fraction is outside 0 to 1.

    Notes
    -----
    3 N2H4 -> 4 (1 - x) NH3 + (1 + 2 x) N2 + 6 x H2. A fixed composition: frozen or constant-property flow only.

    Source
    ------
    Common practice, no source; the equation follows from 3 N2H4 -> 4 NH3 + N2 and 2 NH3 -> N2 + 3 H2.

    Examples
    --------
    >>> hydrazine_products(1.0)
    {'N2': 1.0, 'H2': 2.0}
    """
    x = float(ammonia_dissociation)
    if not 0.0 <= x <= 1.0:
        raise InputError(Problem("ammonia_dissociation", f"{x:g}", "from 0 to 1", "0.4 to 0.7 is usual for a warm bed."))
    made = {"NH3": 4.0 * (1.0 - x) / 3.0, "N2": (1.0 + 2.0 * x) / 3.0, "H2": 2.0 * x}
    return {species: moles for species, moles in made.items() if moles > 0.0}
