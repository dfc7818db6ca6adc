"""Outlines of straight edges and true arcs: made, checked, read and written."""
