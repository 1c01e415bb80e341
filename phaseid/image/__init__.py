"""Image: from a file to clusters of grey."""
