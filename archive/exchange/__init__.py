"""What leaves an archive and comes into one: provenance, packages, citation. Knows open standards, draws nothing."""
