"""Results as CSV, JSON and text for a reader."""
