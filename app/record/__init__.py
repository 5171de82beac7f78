"""What is written for others to read and check: canonical form, and the record of a look."""
