"""Renderings of one run record: the results folder, Markdown, and what a terminal shows.

Nothing here predicts or judges; every rendering reads the record.
"""
