"""The native back end: a program as generated source, compiled by Numba into one self-contained C function."""
