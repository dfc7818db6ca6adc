"""The job file: read, checked, run, and turned into a calculation sheet."""
