"""One function per thing a person can do; each owns its transaction."""
