"""Physics: true even if nobody ever optimized anything."""
