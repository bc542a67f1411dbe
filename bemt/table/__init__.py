"""The coefficient table: building it and looking things up in it."""
