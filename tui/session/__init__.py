"""The session text: a design as text that diffs, reruns and keeps its comments."""
