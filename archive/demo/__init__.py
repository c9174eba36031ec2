"""demo of Stillroom."""
