"""The board's screens. A screen arranges widgets and answers to keys; it reads nothing and decides nothing."""
