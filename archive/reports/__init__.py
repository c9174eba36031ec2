"""reports of Stillroom."""
