"""Slow twins of kernels/part.py, on dense matrices."""

import numpy as np


def part_of(allowed, cost, miss, new, rows, columns):
    """One component as dense arrays of its own."""
    block = np.ix_(rows, columns)
    return allowed[block], cost[block], miss[rows], new[columns]


def event_weights(allowed, cost, miss, new, row_price, column_price):
    """exp(−reduced cost) of pairs (0 where there is no candidate), misses and new columns."""
    pair = np.where(allowed, np.exp(-(cost - row_price[:, None] - column_price[None, :])), 0.0)
    return pair, np.exp(-(miss - row_price)), np.exp(-(new - column_price))


def turned(pair, miss, new):
    """Rows and columns exchanged."""
    return pair.T, new, miss
