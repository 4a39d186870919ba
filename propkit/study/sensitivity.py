"""Variance-based sensitivity: how much of the spread of a result each input makes, alone and with others."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit.errors import ConvergenceError, InputError, MissingExtraError, Problem
from propkit.study.differences import Evaluate
from propkit.study.executors import run_blocks
from propkit.study.joint import JointInputs, check_seed
from propkit.study.propagation import BLOCK

Array = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class SobolIndices:
    """Sobol indices of several results.

    Parameters
    ----------
    paths, results : tuple of str
        Inputs and results, in the order of the arrays.
    first, total : array, shape (results, inputs)
        First-order and total index [1].
    first_half_width, total_half_width : array, shape (results, inputs)
        Half-widths of their 95 % confidence intervals, by bootstrap [1].
    evaluations : int
        Evaluations made.
    seed : int
        Seed of the design and of the bootstrap.
    notes : tuple of str
        What a reader should know about the run.
    """

    paths: tuple[str, ...]
    results: tuple[str, ...]
    first: Array
    total: Array
    first_half_width: Array
    total_half_width: Array
    evaluations: int
    seed: int
    notes: tuple[str, ...] = ()


def sobol_indices(
    evaluate: Evaluate,
    inputs: JointInputs,
    seed: int,
    *,
    base: int = 1024,
    executor: Any = None,
    progress: bool | Callable[[int, int, float], None] = True,
) -> SobolIndices:
    """Return the Sobol indices of every result.

    Parameters
    ----------
    evaluate : callable
        Batch function: arrays by path in, arrays by result out.
    inputs : JointInputs
        Uncertain inputs, not correlated.
    seed : int
        Seed of the design and of the bootstrap, at least 0.
    base : int
        Size of the base design, a power of 2 of at least 64; (inputs + 2) times as many evaluations are made.
    executor : executor, dask client or None
        Where the blocks run.
    progress : bool or callable
        Whether to show a bar for a run of more than a second.

    Returns
    -------
    SobolIndices
        First-order and total indices with their confidence.

    Raises
    ------
    InputError
        For correlated inputs, a design that is none, or draws outside a legal range.
    ConvergenceError
        When an evaluation has no solution, or the run was interrupted: indices need every one.
    MissingExtraError
        When SALib is not installed.

    Notes
    -----
    Source: A. Saltelli et al., Variance based sensitivity analysis of model output, Computer Physics Communications
    181 (2010) 259-270 (from memory), as implemented in SALib.
    """
    try:
        from SALib.analyze import sobol as analysis
        from SALib.sample import sobol as design
    except ImportError as error:
        raise MissingExtraError("SALib", "sensitivity", "Variance-based sensitivity") from error
    seed = check_seed(seed)
    _check_design(inputs, base)
    count = len(inputs.paths)
    problem = {
        "num_vars": max(count, 2),
        "names": [f"x{place}" for place in range(max(count, 2))],
        "bounds": [[0.0, 1.0]] * max(count, 2),
    }
    unit = design.sample(problem, base, calc_second_order=False, seed=seed)
    # quantiles at exactly 0 or 1 may be infinite; the first point of the sequence comes close
    edge = 0.5 / len(unit)
    drawn = inputs.from_unit(np.clip(unit, edge * 1e-3, 1.0 - edge * 1e-3))
    good = inputs.legal(drawn)
    if not good.all():
        raise InputError(
            f"{np.count_nonzero(~good)} of {len(good)} points of the design are illegal; use bounded distributions (pk.Uniform, pk.Triangular)"
        )
    table, results, notes = _evaluate(evaluate, drawn, executor, progress)
    bad = np.count_nonzero(~np.isfinite(table).all(axis=0))
    if bad:
        raise ConvergenceError(f"{bad} of {table.shape[1]} evaluations have no solution; Sobol indices need every one", failed=bad)
    columns: dict[str, list[Array]] = {"S1": [], "ST": [], "S1_conf": [], "ST_conf": []}
    for row in table:
        flat = np.ptp(row) <= 1e-13 * np.abs(row).max()
        found = None if flat else analysis.analyze(problem, row, calc_second_order=False, print_to_console=False, seed=seed)
        for key, kept in columns.items():
            kept.append(np.zeros(count) if found is None else np.asarray(found[key])[:count])
    first, total, first_width, total_width = (np.array(columns[key]) for key in ("S1", "ST", "S1_conf", "ST_conf"))
    return SobolIndices(inputs.paths, results, first, total, first_width, total_width, len(unit), seed, notes)


def _check_design(inputs: JointInputs, base: int) -> None:
    if not inputs.independent:
        raise InputError("Sobol indices are defined for independent inputs; the first-order budget handles correlated ones")
    if isinstance(base, bool) or not isinstance(base, int) or base < 64 or base & (base - 1):
        raise InputError(Problem("base", repr(base), "a power of 2 of at least 64"))


def _evaluate(
    evaluate: Evaluate,
    drawn: dict[str, Array],
    executor: Any,
    progress: bool | Callable[[int, int, float], None],
) -> tuple[Array, tuple[str, ...], tuple[str, ...]]:
    count = len(next(iter(drawn.values())))
    blocks = [{path: values[start : start + BLOCK] for path, values in drawn.items()} for start in range(0, count, BLOCK)]
    kept: list[Any] = []

    def keep(index: int, answer: Any) -> None:
        kept.append(dict(answer))

    sizes = [len(next(iter(block.values()))) for block in blocks]
    run = run_blocks(evaluate, blocks, keep, executor=executor, progress=progress, sizes=sizes, noun="evaluations")
    if run.interrupted:
        raise ConvergenceError("the run was interrupted; Sobol indices need every evaluation", done=run.done)
    results = tuple(kept[0])
    return (
        np.array([np.concatenate([np.asarray(answer[name]) for answer in kept]) for name in results]),
        results,
        run.notes,
    )
