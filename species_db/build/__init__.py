"""Makes ``species_db/data`` again from the packages that carry the sources (not installed)."""
