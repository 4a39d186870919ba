r"""A small written algebra: a formula with {names}, evaluated without `eval` and set in LaTeX.

The grammar is that of Python's arithmetic: numbers, names, + - * / **, unary minus, parentheses and the functions
of `FUNCTIONS`. The name `pi` is the number. The LaTeX made here uses only `\frac{}{}`, `\sqrt{}`, `^{}`, `_{}`,
`\left( \right)`, `\cdot`, `\times 10^{}`, `\pi`, `\,` and operator names `\ln \exp \cos \sin \tan`.
"""

from __future__ import annotations

import ast
import math
import re
from collections.abc import Callable, Mapping
from functools import lru_cache
from typing import Final

FUNCTIONS: Final[Mapping[str, Callable[[float], float]]] = {
    "sqrt": math.sqrt,
    "ln": math.log,
    "exp": math.exp,
    "cos": math.cos,
    "sin": math.sin,
    "tan": math.tan,
}
"""Functions of one argument that a formula may use."""

_PLACE: Final = re.compile(r"\{(\w+)\}")
_SUM, _PRODUCT, _SIGN, _POWER, _ATOM = range(1, 6)


def names(text: str) -> tuple[str, ...]:
    """Return the {names} of a formula in order of appearance, each once."""
    return tuple(dict.fromkeys(_PLACE.findall(text)))


def fill(text: str, words: Mapping[str, str]) -> str:
    """Return the formula with each {name} replaced by its word."""
    return _PLACE.sub(lambda found: words[found.group(1)], text)


def number_text(value: float, digits: int = 6) -> str:
    """Return a number with at most `digits` significant digits, as the grammar reads it: 9.7e6, 0.18."""
    mantissa, _, exponent = f"{value:.{digits}g}".partition("e")
    return f"{mantissa}e{int(exponent)}" if exponent else mantissa


def number_latex(value: float, digits: int = 6) -> str:
    r"""Return a number in LaTeX, powers of ten written out: 9.7 \times 10^{6}."""
    mantissa, _, exponent = number_text(value, digits).partition("e")
    return rf"{mantissa} \times 10^{{{exponent}}}" if exponent else mantissa


@lru_cache(maxsize=256)
def parse(text: str) -> ast.expr:
    """Return the syntax tree of a formula; ValueError for anything outside the grammar."""
    tree = ast.parse(_PLACE.sub(r"\1", text), mode="eval").body
    for node in ast.walk(tree):
        if isinstance(node, ast.Call):
            known = isinstance(node.func, ast.Name) and node.func.id in FUNCTIONS and len(node.args) == 1
            if not known or node.keywords:
                raise ValueError(f"{text!r}: a call outside the grammar")
        elif isinstance(node, ast.Constant):
            if isinstance(node.value, bool) or not isinstance(node.value, int | float):
                raise ValueError(f"{text!r}: {node.value!r} is no number")
        elif not isinstance(node, ast.BinOp | ast.UnaryOp | ast.Name | ast.operator | ast.USub | ast.Load):
            raise ValueError(f"{text!r}: {type(node).__name__} is outside the grammar")
    return tree


def evaluate(text: str, values: Mapping[str, float] | None = None) -> float:
    """Return the value of a formula.

    Parameters
    ----------
    text : str
        The formula, with {names} or with numbers in their place.
    values : mapping, optional
        Number of each name.

    Returns
    -------
    float
        The value.

    Raises
    ------
    ValueError
        For text outside the grammar.
    KeyError
        For a name without a value.
    """
    return _value(parse(text), {"pi": math.pi, **(values or {})})


def _value(node: ast.expr, values: Mapping[str, float]) -> float:
    match node:
        case ast.Constant(value=int() | float() as number):
            return float(number)
        case ast.Name(id=name):
            return float(values[name])
        case ast.UnaryOp(op=ast.USub(), operand=operand):
            return -_value(operand, values)
        case ast.Call(func=ast.Name(id=name), args=[argument]):
            return FUNCTIONS[name](_value(argument, values))
        case ast.BinOp(left=left, op=operator, right=right):
            a, b = _value(left, values), _value(right, values)
            match operator:
                case ast.Add():
                    return a + b
                case ast.Sub():
                    return a - b
                case ast.Mult():
                    return a * b
                case ast.Div():
                    return a / b
                case ast.Pow():
                    return float(a**b)
    raise ValueError(f"{ast.unparse(node)!r} is outside the grammar")


def latex(text: str, symbols: Mapping[str, str]) -> str:
    """Return a formula in LaTeX.

    Parameters
    ----------
    text : str
        The formula with {names}.
    symbols : mapping
        LaTeX of each name: its symbol, or its number as `number_latex` writes it.

    Returns
    -------
    str
        LaTeX of the expression, without delimiters.
    """
    return _latex(parse(text), {"pi": r"\pi", **symbols})[0]


def _wrapped(piece: tuple[str, int], lowest: int) -> str:
    return piece[0] if piece[1] >= lowest else rf"\left({piece[0]}\right)"


def _written(text: str) -> tuple[str, int]:
    """Return a symbol or number with its binding: a signed number binds like a sum, a power of ten like a product."""
    if text.startswith("-"):
        return text, _SUM
    if text.startswith(r"\frac"):
        return text, _POWER
    return text, _PRODUCT if r"\times" in text else _ATOM


def _latex(node: ast.expr, symbols: Mapping[str, str]) -> tuple[str, int]:
    match node:
        case ast.Constant(value=int() | float() as number):
            return _written(number_latex(float(number), 12))
        case ast.Name(id=name):
            return _written(symbols[name])
        case ast.UnaryOp(op=ast.USub(), operand=operand):
            return "-" + _wrapped(_latex(operand, symbols), _PRODUCT), _SIGN
        case ast.Call(func=ast.Name(id="sqrt"), args=[argument]):
            return rf"\sqrt{{{_latex(argument, symbols)[0]}}}", _ATOM
        case ast.Call(func=ast.Name(id=name), args=[argument]):
            inside = _latex(argument, symbols)[0]
            return rf"\{name}\left({inside}\right)", _POWER
        case ast.BinOp(left=left, op=operator, right=right):
            return _latex_pair(_latex(left, symbols), operator, _latex(right, symbols))
    raise ValueError(f"{ast.unparse(node)!r} is outside the grammar")


def _latex_pair(left: tuple[str, int], operator: ast.operator, right: tuple[str, int]) -> tuple[str, int]:
    match operator:
        case ast.Add():
            return f"{left[0]} + {_wrapped(right, _PRODUCT)}", _SUM
        case ast.Sub():
            return f"{left[0]} - {_wrapped(right, _PRODUCT)}", _SUM
        case ast.Mult():
            first, second = _wrapped(left, _PRODUCT), _wrapped(right, _PRODUCT)
            numeric = first[-1] in "0123456789}" and bool(re.match(r"[\d.]", second))
            return first + (r" \cdot " if numeric else r"\,") + second, _PRODUCT
        case ast.Div():
            return rf"\frac{{{left[0]}}}{{{right[0]}}}", _POWER
        case ast.Pow():
            return rf"{_wrapped(left, _ATOM)}^{{{right[0]}}}", _POWER
    raise ValueError(f"{type(operator).__name__} is outside the grammar")
