"""intake of Stillroom."""
