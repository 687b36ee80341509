"""Programs: a diagram put into a format, the definition that runs it, and the native back end."""
