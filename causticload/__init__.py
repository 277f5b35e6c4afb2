"""Finds where, when and how strongly a curved glazed or polished facade concentrates sunlight."""

__version__ = "0.1.0"
