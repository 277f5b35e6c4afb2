"""The version of the program, printed in every result."""

__version__ = "0.1.0"
