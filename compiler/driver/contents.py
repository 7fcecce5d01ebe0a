"""The list of what a scene holds, as text and as JSON."""
