"""The notebook and the command line. Knows no aerodynamics."""
