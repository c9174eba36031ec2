"""reduction of Stillroom."""
