"""Colours of a live plot: roles, and what they are in the light and in the dark theme.

The colours are those of `propkit.view.palette`; the dark theme takes the same hues, mixed with white until they carry.
"""

from __future__ import annotations

from propkit.view import palette
from propkit.view.symbols import text_species

_LIGHT = {
    "ink": palette.INK,
    "quiet": palette.QUIET,
    "accent": palette.ACCENT,
    "hairline": "#e4e8ec",
    "paper": "#ffffff",
}
_DARK = {"ink": "#e4e8ec", "quiet": "#a7b2bd", "accent": palette.ACCENT_DARK, "hairline": "#39434d", "paper": "#15191e"}
LIGHTENED = 0.45


def role_of(colour: int | str) -> str:
    """Return the role of a layer's colour: a word, or the place in the set for series."""
    return colour if isinstance(colour, str) else f"series-{colour}"


def colour(role: str, theme: str = "light") -> str:
    """Return the colour of a role in a theme (``"light"`` or ``"dark"``)."""
    if not role.startswith("series-"):
        return (_LIGHT if theme == "light" else _DARK)[role]
    plain = palette.SERIES[int(role.removeprefix("series-")) % len(palette.SERIES)]
    return plain if theme == "light" else lighter(plain, LIGHTENED)


def lighter(plain: str, share: float) -> str:
    """Return a colour ``#rrggbb`` mixed with a share of white."""
    parts = [int(plain[place : place + 2], 16) for place in (1, 3, 5)]
    return "#" + "".join(f"{round(part + share * (255 - part)):02x}" for part in parts)


def table() -> dict[str, dict[str, str]]:
    """Return theme -> role -> colour, for a display that follows the theme."""
    roles = [*_LIGHT, *(f"series-{place}" for place in range(len(palette.SERIES)))]
    return {theme: {role: colour(role, theme) for role in roles} for theme in ("light", "dark")}


def species(text: str) -> str:
    """Return a species key as it is shown, counts as subscripts."""
    return text_species(text)
