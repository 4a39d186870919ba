"""Colours of a live plot: roles, and what they are in the light and in the dark theme."""

from __future__ import annotations

_LIGHT = {"ink": "#1d2430", "quiet": "#8a93a3", "quiet-text": "#5b6472", "accent": "#0b6e8f", "hairline": "#e3e7ee", "paper": "#ffffff"}
_DARK = {"ink": "#e6eaf2", "quiet": "#7d8798", "quiet-text": "#a7b0bf", "accent": "#4cb8dc", "hairline": "#2e3540", "paper": "#14171c"}
_SERIES_LIGHT = ("#0b6e8f", "#c4561b", "#5a7d1f", "#8a4f9e", "#a0741a", "#44577a")
_SERIES_DARK = ("#4cb8dc", "#f08c4f", "#a3c95c", "#c99be0", "#dcb35a", "#9db2da")


def role_of(colour: int | str) -> str:
    """Return the role of a layer's colour: a word, or the place in the set for series."""
    return colour if isinstance(colour, str) else f"series-{colour}"


def colour(role: str, theme: str = "light") -> str:
    """Return the colour of a role in a theme (``"light"`` or ``"dark"``)."""
    words, series = (_LIGHT, _SERIES_LIGHT) if theme == "light" else (_DARK, _SERIES_DARK)
    if role.startswith("series-"):
        return series[int(role.removeprefix("series-")) % len(series)]
    return words[role]


def table() -> dict[str, dict[str, str]]:
    """Return theme -> role -> colour, for a display that follows the theme."""
    roles = [*_LIGHT, *(f"series-{place}" for place in range(len(_SERIES_LIGHT)))]
    return {theme: {role: colour(role, theme) for role in roles} for theme in ("light", "dark")}


def species(text: str) -> str:
    """Return a species key as it is shown, subscripts set."""
    return text

