"""store of Stillroom."""
