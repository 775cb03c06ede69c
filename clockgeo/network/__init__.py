"""Adjustment of everything that speaks of the same potential."""
