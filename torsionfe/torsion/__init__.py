"""The torsion problem: fields, bounds, adaptive loop, hot spot, the solution."""
