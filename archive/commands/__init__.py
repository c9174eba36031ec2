"""commands of Stillroom."""
