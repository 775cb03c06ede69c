"""Pictures: each a function from plain results to a matplotlib figure."""
