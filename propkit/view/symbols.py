r"""Symbols and chemical formulas for every medium.

Symbols are a small subset of LaTeX: letters, ``\dot{m}``, Greek names, ``\mathrm{M}``, ``_{..}`` and ``^{..}``.
"""

from __future__ import annotations

import re
import unicodedata
from functools import lru_cache
from html import escape

_GREEK = {
    "alpha": "α", "beta": "β", "gamma": "γ", "delta": "δ", "epsilon": "ε", "eta": "η", "theta": "θ", "kappa": "κ", "lambda": "λ", "mu": "μ",
    "nu": "ν", "xi": "ξ", "pi": "π", "rho": "ρ", "sigma": "σ", "tau": "τ", "phi": "φ", "chi": "χ", "psi": "ψ", "omega": "ω", "Delta": "Δ",
    "Gamma": "Γ", "Phi": "Φ", "Sigma": "Σ", "Omega": "Ω", "ell": "ℓ",
}  # fmt: skip
_DOT, _BAR = "\u0307", "\u0304"
_LOWER = str.maketrans("0123456789+-=()aehijklmnoprstuvx", "₀₁₂₃₄₅₆₇₈₉₊₋₌₍₎ₐₑₕᵢⱼₖₗₘₙₒₚᵣₛₜᵤᵥₓ")
_UPPER = str.maketrans("0123456789+-*", "⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻*")
_PIECE = re.compile(r"\\(?P<command>[A-Za-z]+)|(?P<shift>[_^])|(?P<open>\{)|(?P<close>\})|(?P<text>[^\\_^{}]+)")


def _argument(text: str, start: int) -> tuple[str, int]:
    """Return the braced group or single character at `start`, and where it ends."""
    if start < len(text) and text[start] == "{":
        depth = 0
        for position in range(start, len(text)):
            depth += {"{": 1, "}": -1}.get(text[position], 0)
            if depth == 0:
                return text[start + 1 : position], position + 1
    return text[start : start + 1], start + 1


def _walk(text: str, script: object, plain: object, upright: object) -> str:
    out, position = [], 0
    while position < len(text):
        match = _PIECE.match(text, position)
        if match is None:
            break
        position = match.end()
        if match["command"]:
            name = match["command"]
            if name in ("dot", "bar", "mathrm", "text"):
                inner, position = _argument(text, position)
                shown = _walk(inner, script, plain, upright)
                mark = {"dot": _DOT, "bar": _BAR}.get(name, "")
                out.append(upright(inner) if name in ("mathrm", "text") else _accented(shown, mark))  # type: ignore[operator]
            elif name == "frac":
                top, position = _argument(text, position)
                bottom, position = _argument(text, position)
                out.append(f"{_walk(top, script, plain, upright)}/{_walk(bottom, script, plain, upright)}")
            else:
                out.append(plain(_GREEK.get(name, "")))  # type: ignore[operator]
        elif match["shift"]:
            inner, position = _argument(text, position)
            out.append(script(match["shift"], _walk(inner, script, plain, upright), inner))  # type: ignore[operator]
        elif match["text"]:
            out.append(plain(match["text"].strip()))  # type: ignore[operator]
    return "".join(out)


def _accented(shown: str, mark: str) -> str:
    """Return the text with a combining mark behind its last letter, inside a closing tag where there is one."""
    match = re.match(r"(.*?[^<>])((?:</[a-z]+>)*)$", shown, re.DOTALL)
    return f"{match[1]}{mark}{match[2]}" if match else shown + mark


@lru_cache(maxsize=1024)
def html_symbol(symbol: str) -> str:
    """Return a symbol for HTML: italic letters, subscripts and superscripts."""

    def script(shift: str, shown: str, inner: str) -> str:
        tag = "sub" if shift == "_" else "sup"
        return f"<{tag}>{shown}</{tag}>"

    def plain(text: str) -> str:
        return "".join(f"<i>{escape(part)}</i>" if part.isalpha() else escape(part) for part in re.findall(r"[^\W\d_]+|[\W\d_]+", text))

    return _walk(symbol, script, plain, lambda text: escape(text))


def text_symbol(symbol: str) -> str:
    """Return a symbol in Unicode text: ``ṁ``, ``p₀``, ``c*``; a subscript without such letters follows an underscore."""

    def script(shift: str, shown: str, inner: str) -> str:
        moved = shown.translate(_LOWER if shift == "_" else _UPPER)
        whole = all(a != b or a in "*" for a, b in zip(shown, moved, strict=True))
        return moved if whole else (f"_{shown}" if shift == "_" else f"^{shown}")

    return unicodedata.normalize("NFC", _walk(symbol, script, str, str))


def latex_symbol(symbol: str) -> str:
    """Return a symbol for LaTeX, as it is stored."""
    return symbol


_FORMULA = re.compile(r"(?<=[A-Za-z)])(\d+(?:\.\d+)?)")


def _split_species(name: str) -> tuple[str, str]:
    """Return formula, closed up, and remark of a species key: ``C2H2 (acetylene)`` -> ``C2H2``, `` (acetylene)``."""
    formula, space, remark = name.partition(" (")
    return formula.replace(" ", ""), f"{space}{remark}" if space else ""


def html_species(name: str) -> str:
    """Return a species key with its counts set as subscripts."""
    formula, remark = _split_species(name)
    return _FORMULA.sub(r"<sub>\1</sub>", escape(formula)) + escape(remark)


def text_species(name: str) -> str:
    """Return a species key with Unicode subscripts."""
    formula, remark = _split_species(name)
    return _FORMULA.sub(lambda match: match[1].translate(_LOWER), formula) + remark


def latex_species(name: str) -> str:
    """Return a species key for LaTeX."""
    formula, remark = _split_species(name)
    lowered = _FORMULA.sub(r"_{\1}", formula)
    return rf"\mathrm{{{lowered}}}" + (rf"\text{{{remark}}}" if remark else "")
