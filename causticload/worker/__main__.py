"""Runs the worker: ``python -m causticload.worker``."""

from causticload.worker import serve

serve()
