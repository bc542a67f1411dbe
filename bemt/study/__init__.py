"""Many solutions made into one answer."""
