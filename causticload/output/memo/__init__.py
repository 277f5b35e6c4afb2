"""The memo of a year: one content, written for a word processor, for paper and for a browser."""

from causticload.output.memo.write import FORMATS, available_formats, write_memo

__all__ = ["FORMATS", "available_formats", "write_memo"]
