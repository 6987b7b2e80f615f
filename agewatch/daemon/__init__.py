"""The daemon: reads, assesses, alarms, records and delivers, for years. The store's only writer."""

import logging

logging.getLogger(__name__).addHandler(logging.NullHandler())  # who wants its log says so: logs.py
