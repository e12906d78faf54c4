"""Models: cubic forms, alpha functions, translations, and the catalogue of named equations (data only)."""
