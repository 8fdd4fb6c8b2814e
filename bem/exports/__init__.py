"""Text tables, JSON, CSV and HTML of a result."""
