"""The command: the service's checks at a shell, and the service itself."""
