"""Reduced stress from pairs and senses, its uncertainty, and what it says of each fault."""
