"""Equilibrium constants: bases and their conversion, scale, reverse, sum, K(T) and fits. All in ln K."""

from xleq.constants.cells import read_k, write_k

__all__ = ["read_k", "write_k"]
