"""Builders that several test folders share."""
