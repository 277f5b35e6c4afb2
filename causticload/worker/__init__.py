"""A host program's door to the engine: JSON-RPC 2.0 on standard input and output."""

from causticload.worker.server import serve

__all__ = ["serve"]
