"""Speed of the solver and the page: ``python -m tests.benchmark``."""
