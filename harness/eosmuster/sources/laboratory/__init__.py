"""Own laboratory data in CSV: the reader, and what it is made of."""
