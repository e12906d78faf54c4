"""Measured data in ThermoML: the reader, and what it is made of."""
