"""Tests of flowplan; see DEVELOPERS.md for what each folder may assert."""
