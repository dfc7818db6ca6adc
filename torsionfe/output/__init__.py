"""Figures, sheets and files for reports."""
