"""physics of Stillroom."""
