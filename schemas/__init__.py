"""schemas of Stillroom."""
