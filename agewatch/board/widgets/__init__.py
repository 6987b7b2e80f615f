"""The board's own widgets: tables that render only what is seen, charts in braille, the head, the panels."""
