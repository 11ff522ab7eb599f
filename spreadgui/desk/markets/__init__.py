"""Markets: their marks by delivery, and what holds for all of their deliveries."""
