"""HTTP: the app, its operations, what may go wrong with a request and how that is said."""
