"""The pages, served on this machine only: requests become acts, books pages, errors sentences."""
