"""What flies: configuration, trim, speed, landing."""
