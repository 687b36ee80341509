"""The command line, a thin skin over everything below."""
