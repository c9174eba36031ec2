"""archive of Stillroom."""
