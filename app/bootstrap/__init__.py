"""What runs before any package is installed; it knows the standard library and app.errors only."""
