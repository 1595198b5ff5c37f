"""Random and named problems that try to break the minimiser."""
