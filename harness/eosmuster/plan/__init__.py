"""Plans: what is to be swept, against what, and how it is judged.

`schema` holds the frozen contracts, `reading` turns TOML into them, `tolerances` answers which limit
governs a state, `limits` holds the default limits, and `builtin` the plans that come with the package.
"""
