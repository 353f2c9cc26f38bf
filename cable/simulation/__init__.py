"""Stochastic simulation of a scenario, to check the linear theory and to see where it ends."""
