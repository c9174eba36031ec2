"""Plans of this group; Stillroom finds them through the entry point group `stillroom.plans`."""
