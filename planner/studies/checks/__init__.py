"""The checks of an audit, one module each, and the bench they share."""
