"""Compiled kernels: arrays in, arrays out, nothing but numpy, numba and math.

Everything else in the package names, checks and orders; nothing in here does.
"""
