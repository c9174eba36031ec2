"""migrations of Stillroom."""
