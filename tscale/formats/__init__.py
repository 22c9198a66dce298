"""Labels of instants: calendar texts, Julian dates, leap seconds. Array functions without state."""
