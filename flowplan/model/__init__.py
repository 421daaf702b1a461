"""The flow file as frozen models: what may stand in it and what it means."""
