"""Studies: one section, sections beside the hand method, many sections."""
