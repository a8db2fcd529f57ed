"""Reports for human readers."""
