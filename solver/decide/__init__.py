"""Is it good enough, and what would make it so."""
