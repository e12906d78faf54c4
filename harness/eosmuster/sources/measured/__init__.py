"""What measured data become, whichever the format: the table, its substances, uncertainties, repeats and files."""
