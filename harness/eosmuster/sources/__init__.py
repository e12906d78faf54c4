"""Readers of reference data: one module a source, one table out."""
