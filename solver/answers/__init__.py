"""What is said about a solved field."""
