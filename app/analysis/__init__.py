"""From frozen inputs to frozen results."""
