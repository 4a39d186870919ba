"""Sobol indices against the Ishigami function, whose indices are known in closed form."""

import math
import sys

import numpy as np
import pytest

from propkit.errors import ConvergenceError, InputError, MissingExtraError
from propkit.study.distributions import Normal, Uniform
from propkit.study.joint import JointInputs
from propkit.study.sensitivity import sobol_indices

pytest.importorskip("SALib")

A, B = 7.0, 0.1


def ishigami(x):
    return {"y": np.sin(x["x1"]) + A * np.sin(x["x2"]) ** 2 + B * x["x3"] ** 4 * np.sin(x["x1"])}


INPUTS = JointInputs({f"x{place}": Uniform(math.pi).resolve(0.0, "") for place in (1, 2, 3)})


def test_ishigami_function():
    # T. Ishigami, T. Homma, An importance quantification technique in uncertainty analysis for computer models (1990);
    # closed-form variances from memory
    v1 = 0.5 * (1.0 + B * math.pi**4 / 5.0) ** 2
    v2 = A**2 / 8.0
    v13 = B**2 * math.pi**8 * (1.0 / 18.0 - 1.0 / 50.0)
    whole = v1 + v2 + v13
    found = sobol_indices(ishigami, INPUTS, seed=1, base=4096, progress=False)
    np.testing.assert_allclose(found.first[0], [v1 / whole, v2 / whole, 0.0], atol=0.02)
    np.testing.assert_allclose(found.total[0], [(v1 + v13) / whole, v2 / whole, v13 / whole], atol=0.02)
    assert (np.abs(found.first[0] - [v1 / whole, v2 / whole, 0.0]) <= 1.5 * found.first_half_width[0]).all()
    assert found.evaluations == 4096 * 5


def test_linear_model_gives_the_first_order_budget():
    inputs = JointInputs({"a": Normal(3.0).resolve(0.0, ""), "b": Normal(4.0).resolve(0.0, "")})
    found = sobol_indices(lambda x: {"y": x["a"] + x["b"], "flat": 0.0 * x["a"] + 5.0}, inputs, seed=2, progress=False)
    np.testing.assert_allclose(found.first[0], [9 / 25, 16 / 25], atol=0.01)
    np.testing.assert_allclose(found.total[0], [9 / 25, 16 / 25], atol=0.01)
    np.testing.assert_array_equal(found.first[1], 0.0)


def test_seed_reproduces():
    one, two = (sobol_indices(ishigami, INPUTS, seed=5, base=256, progress=False) for _ in range(2))
    assert np.array_equal(one.first, two.first)
    assert np.array_equal(one.total_half_width, two.total_half_width)


def test_one_input_takes_everything():
    inputs = JointInputs({"a": Uniform(1.0).resolve(2.0, "")})
    found = sobol_indices(lambda x: {"y": x["a"] ** 2}, inputs, seed=1, progress=False)
    assert found.first.shape == (1, 1)
    assert found.first[0, 0] == pytest.approx(1.0, abs=0.01)


def test_what_has_no_indices_is_refused():
    one = Normal(1.0).resolve(0.0, "")
    with pytest.raises(InputError, match="independent"):
        sobol_indices(ishigami, JointInputs({"a": one, "b": one}, {("a", "b"): 0.5}), seed=1)
    with pytest.raises(InputError, match="power of 2"):
        sobol_indices(ishigami, INPUTS, seed=1, base=1000)
    with pytest.raises(InputError, match="illegal"):
        sobol_indices(ishigami, JointInputs({"a": one}, bounds={"a": (0.0, 9.0)}), seed=1)
    with pytest.raises(ConvergenceError, match="no solution"):
        sobol_indices(lambda x: {"y": np.where(x["x1"] > 3.0, np.nan, x["x1"])}, INPUTS, seed=1, base=64, progress=False)


def test_missing_package_names_the_line_that_installs_it(monkeypatch):
    monkeypatch.setitem(sys.modules, "SALib.analyze", None)
    with pytest.raises(MissingExtraError, match=r"pip install 'propkit\[sensitivity\]'"):
        sobol_indices(ishigami, INPUTS, seed=1)
