"""The registry of result variables and the builder of labelled datasets."""
