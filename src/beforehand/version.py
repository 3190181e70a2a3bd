"""The version of the program, in the one place that the build and the record read."""

__version__ = "0.1.0"
