"""Triangulation of an outline and its local refinement."""
