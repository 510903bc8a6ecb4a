"""Search: patterns that meet the requires of a problem. Knows bilinear forms and conditions, nothing of magnets."""
