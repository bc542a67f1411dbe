"""Section data: tables of one shape, families over thickness and camber, and their extension to the full circle."""
