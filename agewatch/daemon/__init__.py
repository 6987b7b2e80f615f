"""The daemon: reads, assesses, alarms, records and delivers, for years. The store's only writer."""
