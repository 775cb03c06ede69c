"""The hall: where a fractional frequency becomes a potential difference."""
