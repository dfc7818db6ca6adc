"""Outlines from and to files: one module a format, with chaining and nesting of what they hold."""

from torsionfe.outline.files.read import ReadResult, read_outline, read_outline_report
from torsionfe.outline.files.write import write_outline

__all__ = ["ReadResult", "read_outline", "read_outline_report", "write_outline"]
