"""index of Stillroom."""
