"""Broken study files, each with the message it must give."""
