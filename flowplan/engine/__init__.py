"""Pure arithmetic on arrays and graphs: placement, overlay, margin."""
