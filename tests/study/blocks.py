"""Pure functions of a block that processes and clusters can import."""

import os
import time

import numpy as np


def heavy(block):
    number, size = block
    values = np.random.default_rng(number).standard_normal(size)
    return np.sin(values).cumsum()


def fails_at_three(block):
    if block[0] == 3:
        raise ArithmeticError("block three has no solution")
    return heavy(block)


def dies_elsewhere(block):
    """End any process but the one that made the block."""
    number, size, parent = block
    if number == 2 and os.getpid() != parent:
        os._exit(3)
    return heavy((number, size))


def slow(block):
    time.sleep(0.02)
    return heavy(block)
