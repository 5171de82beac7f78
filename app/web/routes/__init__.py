"""One module for each part of the pages' addresses."""
