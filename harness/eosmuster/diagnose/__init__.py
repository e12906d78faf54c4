"""Diagnosis: which reference stands alone, and what constants, alpha functions and references say of themselves."""
