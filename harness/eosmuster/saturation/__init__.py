"""Saturated states of cubic equations of state: reduced curves, their tables, and the two solvers."""
