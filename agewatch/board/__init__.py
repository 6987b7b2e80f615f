"""The supervisor's screen: reads the store in threads, acts through the daemon, and only shows what both say."""
