"""Columns as curves: what is drawn of them, what may be laid over what, and what is taken away."""
