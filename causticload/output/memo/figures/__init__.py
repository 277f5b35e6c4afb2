"""Figures of a memo: plans, charts of the year, maps of the facade and views from a spot."""
