"""templates of Stillroom."""
