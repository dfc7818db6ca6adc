"""Lagrange elements of any order on true arcs: spaces, assembly, sparse solves."""
