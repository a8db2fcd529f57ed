"""Case files, candidate files and results on disk."""
