"""Example scenarios and the measured tables that ship with them."""
